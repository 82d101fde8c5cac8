"""Three flows solved again with a general-purpose finite-element library, from the velocity alone.

Quadratic triangles, and at every step the linear problem of the last apparent viscosity (Kacanov 1959). Its
flow rate is guaranteed nothing; half the mesh size tells its error.
"""

from __future__ import annotations

import numpy as np
import pytest
from skfem import Basis, BilinearForm, ElementTriP2, LinearForm, MeshTri, MeshTri2, condense, solve

from ductsolve.mesh.sections import annulus, ellipse, rectangle
from ductsolve.rheology.laws import CarreauYasuda, PowerLaw
from ductsolve.solver.solve import solve as duct_solve

MOST_STEPS, SETTLED = 80, 1e-9
SLOWEST = 1e-7  # of the largest shear rate: below it the viscosity is taken as there


@BilinearForm
def viscous(u, v, w):
    return w["viscosity"] * (u.grad[0] * v.grad[0] + u.grad[1] * v.grad[1])


@LinearForm
def driven(v, w):
    return w["gradient"] * v


def flow_rate(mesh, walls, fluid, gradient):
    """Flow rate through a mesh whose facets ``walls`` are at rest, the others symmetry lines."""
    basis = Basis(mesh, ElementTriP2(), intorder=6)
    at_rest = basis.get_dofs(walls).flatten()
    load = driven.assemble(basis, gradient=gradient)
    viscosity, before = np.ones_like(basis.dx), np.inf
    for _ in range(MOST_STEPS):
        velocity = solve(*condense(viscous.assemble(basis, viscosity=viscosity), load, D=at_rest))
        flow = float(velocity @ load) / gradient
        if abs(flow / before - 1) < SETTLED:
            return flow
        slopes = basis.interpolate(velocity).grad
        rate = np.sqrt(slopes[0] ** 2 + slopes[1] ** 2)
        rate = np.maximum(rate, SLOWEST * rate.max())
        viscosity, before = fluid.stress(rate) / rate, flow
    raise AssertionError("the finite elements did not settle")


def grid(u, v, place):
    """Six-node triangles on a mapped grid of (0, 1)^2, and the straight mesh before it is mapped."""
    plain = MeshTri.init_tensor(u, v)
    curved = MeshTri2.from_mesh(plain)
    return MeshTri2(np.array(place(*curved.doflocs)), curved.t), plain


def quarter_of_a_square(n):
    """Corners at the origin and (1/2, 1/2), finer towards the walls."""
    lines = np.sin(np.linspace(0, np.pi / 2, n + 1))
    mesh, plain = grid(lines, lines, lambda u, v: (u / 2, v / 2))
    return mesh, plain.facets_satisfying(lambda x: np.maximum(*x) > 1 - 1e-9, boundaries_only=True), 4


def whole_ellipse(n):
    disc = MeshTri2.init_circle(int(np.log2(n)))
    mesh = MeshTri2(disc.doflocs * np.array([[1.0], [0.5]]), disc.t)
    return mesh, mesh.boundary_facets(), 1


def half_of_an_eccentric_annulus(n):
    """Diameters 2 and 1, eccentricity a half, cut down the middle."""

    def place(u, v):
        radius, offset = 0.5 + 0.5 * u, 0.25 * (1 - u)
        return radius * np.sin(np.pi * v), -offset - radius * np.cos(np.pi * v)

    mesh, plain = grid(np.linspace(0, 1, n + 1), np.linspace(0, 1, 3 * n + 1), place)
    return mesh, plain.facets_satisfying(lambda x: np.abs(x[0] - 0.5) > 0.5 - 1e-9, boundaries_only=True), 2


CASES = {
    "square": (rectangle(1.0, 1.0), quarter_of_a_square, PowerLaw(1.0, 0.5), 1.0),
    "ellipse": (ellipse(2.0, 1.0), whole_ellipse, CarreauYasuda(2.0, 0.01, 5.0, 0.4), 3.0),
    "eccentric annulus": (annulus(2.0, 1.0, 0.5), half_of_an_eccentric_annulus, PowerLaw(1.0, 0.6), 2.0),
}


@pytest.mark.parametrize("name", CASES)
def test_flow_rate(name):
    section, make_mesh, fluid, gradient = CASES[name]
    coarse, fine = (
        parts * flow_rate(mesh, walls, fluid, gradient) for mesh, walls, parts in map(make_mesh, (8, 16))
    )
    error = abs(fine - coarse)
    assert error < 1e-3 * fine
    for accuracy in (0.01, 1e-3):
        low, high = duct_solve(
            section, fluid, pressure_gradient=gradient, accuracy=accuracy
        ).flow_rate_bracket
        assert low - error <= fine <= high + error
