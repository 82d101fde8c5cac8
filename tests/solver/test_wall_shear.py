"""The wall-shear map: in order along the walls, right on average, and right at its extremes."""

from __future__ import annotations

import numpy as np
import pytest
from published_data import row
from solver_cases import L_CORNERS, SECTIONS

from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import annulus, circle, rectangle
from ductsolve.rheology.laws import Bingham, HerschelBulkley, Newtonian, PowerLaw
from ductsolve.solver.solve import solve

LOOPS = {"one hole": 2, "two holes": 3, "L": 1}


def shear_of(section, fluid=None, gradient=2.0, accuracy=0.01):
    return solve(
        section, fluid or PowerLaw(1.0, 0.6), pressure_gradient=gradient, accuracy=accuracy
    ).wall_shear


@pytest.mark.parametrize("name", SECTIONS)
def test_pieces_follow_each_other_along_each_loop(name):
    section = SECTIONS[name]
    shear = shear_of(section, accuracy=0.05)
    loops = np.unique(shear.loop)
    assert len(loops) == LOOPS.get(name, 2 if "annulus" in name else 1)
    assert np.all(np.diff(shear.loop) >= 0)
    for loop in loops:
        on = shear.loop == loop
        position, half = shear.position[on], shear.length[on] / 2
        step = np.linalg.norm(np.roll(position, -1, axis=0) - position, axis=1)
        reach = half + np.roll(half, -1)
        # Middles of neighbours are half their lengths apart along the wall, less across a corner or arc. On
        # an ellipse they are middles of the parameter, a little off in length.
        assert np.all(step <= 1.02 * reach)
        assert np.all(step >= 0.3 * reach)


@pytest.mark.parametrize("name", SECTIONS)
def test_fluid_lies_to_the_left(name):
    """The outer loop runs counter-clockwise and is the longest; holes run clockwise."""
    shear = shear_of(SECTIONS[name], accuracy=0.05)
    for loop in np.unique(shear.loop):
        x, y = shear.position[shear.loop == loop].T
        area = (x @ np.roll(y, -1) - y @ np.roll(x, -1)) / 2
        assert (area > 0) == (loop == 0)


@pytest.mark.parametrize("name", SECTIONS)
def test_mean_is_gradient_times_a_quarter_of_the_hydraulic_diameter(name):
    section = SECTIONS[name]
    shear = shear_of(section, gradient=3.0, accuracy=0.05)
    # Parabolic edges are a little shorter or longer than the true arcs.
    assert shear.mean == pytest.approx(3.0 * section.hydraulic_diameter / 4, rel=1e-4)
    assert shear.length.sum() == pytest.approx(section.perimeter, rel=1e-4)


@pytest.mark.parametrize("name", ["one hole", "two holes", "concentric annulus"])
def test_walls_are_named(name):
    shear = shear_of(SECTIONS[name])
    for loop in np.unique(shear.loop):
        (wall,) = {shear.names[k] for k in shear.wall[shear.loop == loop]}
        assert ("outer" in wall) == (loop == 0)


def long_wall_stress(height, x):
    """Newtonian stress on the long wall of a rectangle 1 wide at x from its middle, for a gradient of 1.

    From Boussinesq's (1868) series for the velocity, differentiated.
    """
    odd, half = np.arange(1, 400, 2)[:, None], height / 2
    decay = np.exp(odd * np.pi * (np.abs(x) - 0.5) / height) * (
        1 + np.exp(-2 * odd * np.pi * np.abs(x) / height)
    )
    decay /= 1 + np.exp(-odd * np.pi / height)
    return 8 * half / np.pi**2 * ((1 - decay) / odd**2).sum(axis=0)


@pytest.mark.parametrize("aspect", [1.0, 0.75, 0.5, 0.25, 0.1])
def test_along_the_long_wall_of_a_rectangle(aspect):
    shear = shear_of(rectangle(1.0, aspect), Newtonian(1.0), gradient=1.0, accuracy=1e-3)
    top = shear.position[:, 1] > 0.499 * aspect
    gauss, weight = np.polynomial.legendre.leggauss(8)
    for x, length, stress in zip(shear.position[top, 0], shear.length[top], shear.stress[top], strict=True):
        known = long_wall_stress(aspect, x + length / 2 * gauss) @ weight / 2
        assert stress == pytest.approx(known, abs=5e-3 * shear.mean)


@pytest.mark.parametrize("aspect", [1.0, 0.75, 0.5, 0.25, 0.1])
def test_extremes_in_a_rectangle(aspect):
    """Largest at the middle of the long sides, by Boussinesq's (1868) series; small in the corners."""
    found = row("A1_rect_newtonian", aspect=aspect)
    shear = shear_of(rectangle(1.0, aspect), Newtonian(1.0), accuracy=1e-5)
    stress, place = shear.largest_away
    assert shear.max == stress
    # Values are means over edges, the middle one of which is up to an eighth of the side long.
    assert stress / shear.mean == pytest.approx(found["taumax_over_taumean_long"], rel=5e-3)
    assert np.abs(place[1]) == pytest.approx(aspect / 2) or aspect == 1.0
    assert np.abs(place).min() < 0.1 or aspect == 0.1  # where the stress hardly varies along the middle
    short = np.abs(shear.position[:, 0]) > 0.4999
    at_middle = np.argmin(np.abs(shear.position[short][:, 1]))
    known = found["tau_short_centre_over_taumean"]
    assert shear.stress[short][at_middle] / shear.mean == pytest.approx(known, rel=5e-3)
    assert 0 < shear.min < 0.3 * shear.mean


def annulus_stresses(ratio, fluid):
    """Mean stress on the inner and outer walls over G Ro, and how far the stress strays from the means."""
    shear = shear_of(annulus(2.0, 2 * ratio), fluid, gradient=2.0, accuracy=1e-3)
    inner = np.hypot(*shear.position.T) < (1 + ratio) / 2
    means, strays = [], []
    for on in (inner, ~inner):
        means.append(shear.stress[on] @ shear.length[on] / shear.length[on].sum() / 2)
        strays.append(np.ptp(shear.stress[on]) / means[-1])
    return means, max(strays)


@pytest.mark.parametrize(
    "ratio, index", [(0.1, 0.5), (0.3, 0.2), (0.5, 1), (0.5, 0.5), (0.9, 0.5), (0.5, 0.1)]
)
def test_concentric_annulus_power_law(ratio, index):
    found = row("B1_powerlaw_concentric_annulus", kappa=ratio, n=index)
    stresses, stray = annulus_stresses(ratio, PowerLaw(1.0, index))
    assert stresses == pytest.approx([found["tau_inner_over_GRo"], found["tau_outer_over_GRo"]], rel=2e-3)
    assert stray < 0.05


@pytest.mark.parametrize(
    "ratio, index, share", [(0.1, 1, 0.25), (0.5, 1, 0.25), (0.5, 0.5, 0.5), (0.9, 1, 0.1)]
)
def test_concentric_annulus_yield_stress(ratio, index, share):
    found = row("C2_bingham_HB_concentric_annulus", kappa=ratio, n=index, **{"T0_over_(1-kappa)": share})
    fluid = HerschelBulkley(found["T0"], 1.0, index)
    stresses, stray = annulus_stresses(ratio, fluid)
    assert stresses == pytest.approx([found["tau_inner_over_GRo"], found["tau_outer_over_GRo"]], rel=2e-3)
    assert stray < 0.05


def test_circle_is_uniform():
    shear = shear_of(circle(2.0), Bingham(0.3, 1.0), gradient=2.0, accuracy=1e-3)
    assert np.all(np.abs(shear.stress - 1.0) < 2e-3)


RE_ENTRANT = {
    "L": (polygon(L_CORNERS), [(1.0, 1.0)]),
    "one hole": (SECTIONS["one hole"], [(0.8, 0.8), (0.8, 1.3), (1.2, 0.8), (1.2, 1.3)]),
}


@pytest.mark.parametrize("name", RE_ENTRANT)
def test_re_entrant_corners_are_said_to_be_unbounded(name):
    section, corners = RE_ENTRANT[name]
    largest = []
    for accuracy in (1e-3, 1e-4):
        shear = shear_of(section, Newtonian(1.0), accuracy=accuracy)
        assert shear.max == np.inf
        assert sorted(map(tuple, np.round(shear.corners, 12))) == corners
        stress, place = shear.largest_away
        assert np.isfinite(stress)
        assert np.linalg.norm(place - shear.corners, axis=1).min() >= 0.05 * section.hydraulic_diameter
        largest.append((stress, shear.stress.max()))
    # Away from the corner the largest stress has settled; at it the computed one grows with the mesh.
    assert largest[1][0] == pytest.approx(largest[0][0], rel=0.05)
    assert largest[1][1] > 1.3 * largest[0][1]


@pytest.mark.parametrize("name", ["square", "triangle", "circle", "concentric annulus"])
def test_bounded_elsewhere(name):
    shear = shear_of(SECTIONS[name])
    assert len(shear.corners) == 0
    assert not shear.near_corner.any()
    assert np.isfinite(shear.max)
    assert shear.max == shear.largest_away[0] >= shear.smallest[0] == shear.min
