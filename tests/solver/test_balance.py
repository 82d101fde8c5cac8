"""Forces balance to rounding on every triangle, between neighbours and on the whole."""

from __future__ import annotations

import numpy as np
import pytest
from solver_cases import SECTIONS, relaxed

from ductsolve.rheology.laws import CarreauYasuda, HerschelBulkley, PowerLaw
from ductsolve.solver.levels import first_level, relax
from ductsolve.solver.solve import solve

FLUIDS = {
    "thinning": PowerLaw(1.0, 0.4),
    "yielding": HerschelBulkley(0.02, 1.0, 0.6),
    "plateaus": CarreauYasuda(3.0, 0.1, 5.0, 0.4),
}
ROUNDING = 1e-12

# Points along the sides of the reference triangle (0,0), (1,0), (0,1), from each corner to the next.
POSITION, WEIGHT = (v / 2 for v in np.polynomial.legendre.leggauss(5))
POSITION = POSITION + 0.5
CORNERS = np.array([[0.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
DIRECTIONS = np.roll(CORNERS, -1, axis=0) - CORNERS


def shape_slopes(b, c):
    """Reference gradients (2, 6) of the six shape functions at (b, c)."""
    a = 1 - b - c
    return np.array(
        [
            [1 - 4 * a, 4 * b - 1, 0, 4 * (a - b), 4 * c, -4 * c],
            [1 - 4 * a, 0, 4 * c - 1, -4 * b, 4 * b, 4 * (a - c)],
        ]
    )


def shape_values(b, c):
    a = 1 - b - c
    return np.array([a * (2 * a - 1), b * (2 * b - 1), c * (2 * c - 1), 4 * a * b, 4 * b * c, 4 * c * a])


def side_tractions(level, psi):
    """Outward pull of the stress per unit reference length at points of every side, (n_triangles, 3, 5).

    Written out again from the definition stress/G = (origin - x)/2 + curl psi, triangle by triangle.
    """
    nodes = level.mesh.points[level.mesh.triangles]
    pulls = np.empty((len(nodes), 3, len(POSITION)))
    for side, (corner, direction) in enumerate(zip(CORNERS, DIRECTIONS, strict=True)):
        for k, s in enumerate(POSITION):
            slopes = shape_slopes(*(corner + s * direction))
            jacobian = np.einsum("ri,tid->trd", slopes, nodes)
            slope_psi = np.linalg.solve(jacobian, np.einsum("ri,ti->tr", slopes, psi)[..., None])[..., 0]
            position = np.einsum("i,tid->td", shape_values(*(corner + s * direction)), nodes)
            stress = (level.origin - position) / 2 + np.column_stack([slope_psi[:, 1], -slope_psi[:, 0]])
            along = direction @ jacobian
            pulls[:, side, k] = stress[:, 0] * along[:, 1] - stress[:, 1] * along[:, 0]
    return pulls


def rounding(level, section):
    """The known part of the stress, half the distance from the origin, cancels down to about a quarter of
    the hydraulic diameter: slender sections lose digits in that ratio."""
    arm = np.linalg.norm(level.mesh.points - level.origin, axis=1).max()
    return ROUNDING * max(1.0, 2 * arm / section.hydraulic_diameter)


def side_lengths(level):
    corners = level.mesh.points[level.mesh.triangles[:, :3]]
    return np.linalg.norm(np.roll(corners, -1, axis=1) - corners, axis=2)


def triangle_areas(level):
    """Areas (n_triangles,), from the outline alone: half the integral of x dy - y dx, about one corner."""
    nodes = level.mesh.points[level.mesh.triangles]
    nodes = nodes - nodes[:, :1]
    corners, middles = nodes[:, :3], nodes[:, 3:]
    start, end = corners, np.roll(corners, -1, axis=1)

    def cross(u, v):
        return u[..., 0] * v[..., 1] - u[..., 1] * v[..., 0]

    return (cross(start, end) / 2 + 2 / 3 * cross(middles - start, end - middles)).sum(axis=1)


@pytest.fixture(scope="module", params=SECTIONS)
def iterates(request):
    section = SECTIONS[request.param]
    gradient = 8.0 / section.hydraulic_diameter
    return section, [relaxed(section, fluid, gradient, levels=3) for fluid in FLUIDS.values()]


def test_every_triangle_is_in_balance(iterates):
    section, found = iterates
    for iterate in found:
        forces = (side_tractions(iterate.level, iterate.psi) * WEIGHT).sum(axis=(1, 2))
        areas = triangle_areas(iterate.level)
        assert np.all(np.abs(forces + areas) <= rounding(iterate.level, section) * areas)


def test_neighbours_agree_on_the_traction_between_them(iterates):
    section, found = iterates
    for iterate in found:
        level = iterate.level
        pulls = side_tractions(level, iterate.psi).reshape(-1, len(POSITION))
        side = level.mesh.triangles[:, 3:].ravel()
        order = np.argsort(side, kind="stable")
        same = np.flatnonzero(side[order][1:] == side[order][:-1])
        mine, yours = pulls[order[same]], pulls[order[same + 1]][:, ::-1]
        scale = np.abs(level.stress(iterate.psi)).max() * side_lengths(level).ravel()[order[same]]
        assert len(same) > len(level.mesh.triangles)
        assert np.all(np.abs(mine + yours) <= rounding(level, section) * scale[:, None])


def test_symmetry_lines_bear_no_force(iterates):
    section, found = iterates
    for iterate in found:
        level = iterate.level
        pulls = side_tractions(level, iterate.psi).reshape(-1, len(POSITION))
        lines = level.mesh.edges[level.mesh.symmetry_edges]
        on_line = np.isin(level.mesh.triangles[:, 3:].ravel(), lines[:, 2])
        scale = np.abs(level.stress(iterate.psi)).max() * side_lengths(level).ravel()[on_line]
        assert np.all(np.abs(pulls[on_line]) <= rounding(level, section) * scale[:, None])


@pytest.mark.parametrize("law", FLUIDS)
@pytest.mark.parametrize("name", SECTIONS)
def test_wall_forces_sum_to_gradient_times_area(name, law):
    section = SECTIONS[name]
    gradient = 8.0 / section.hydraulic_diameter
    shear = solve(section, FLUIDS[law], pressure_gradient=gradient, accuracy=0.1).wall_shear
    assert shear.stress @ shear.length == pytest.approx(gradient * section.area, rel=ROUNDING)


def test_balance_holds_before_anything_has_converged():
    section = SECTIONS["two holes"]
    level = first_level(section)
    rng = np.random.default_rng(5)
    system = level.stress_system
    psi = system.spread(rng.normal(size=system.size + level.cuts.shape[2]))
    pulls = side_tractions(level, psi) * WEIGHT
    assert np.all(np.abs(pulls.sum(axis=(1, 2)) + triangle_areas(level)) <= 10 * ROUNDING)
    assert level.wall_forces(psi).sum() == pytest.approx(section.area, rel=ROUNDING)


def test_only_the_gradient_scales_a_newtonian_stress():
    level = first_level(SECTIONS["L"])
    one, other = (relax(level, PowerLaw(mu, 1.0), g, None, 1e-6).psi for mu, g in ((1.0, 1.0), (3.0, 70.0)))
    assert other == pytest.approx(one, rel=1e-9, abs=1e-9)
