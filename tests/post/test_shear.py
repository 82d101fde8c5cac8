"""Stress inside the section, and how far a tabulated curve is stretched."""

import numpy as np
import pytest

import ductsolve
from ductsolve.post.shear import beyond_table, nodal_shear_stress, working_rates

GRADIENT = 2000.0


@pytest.fixture(scope="module")
def tube():
    fluid = ductsolve.FlowCurve([1, 3, 10], [3.1, 6.5, 14.2])
    return ductsolve.solve(ductsolve.circle(0.1), fluid, pressure_gradient=GRADIENT, accuracy=1e-3)


def test_stress_in_a_tube_rises_with_the_radius(tube):
    radius = np.linalg.norm(tube.mesh.points, axis=1)
    assert nodal_shear_stress(tube) == pytest.approx(GRADIENT * radius / 2, abs=2e-3 * GRADIENT * 0.05)


def test_stress_vanishes_where_symmetry_has_it_vanish():
    flow = ductsolve.solve(ductsolve.rectangle(0.1, 0.02), ductsolve.PowerLaw(1.0, 0.4), flow_rate=1e-4)
    centre = np.linalg.norm(flow.mesh.points, axis=1).argmin()
    assert nodal_shear_stress(flow)[centre] == pytest.approx(0, abs=1e-12)


def test_working_rates_reach_to_the_wall(tube):
    """In a tube the power inside the radius r goes as the integral of rate x r^2."""
    rates = working_rates(tube)
    at_wall = float(tube.fluid.rate(GRADIENT * 0.05 / 2))
    assert 0.95 * at_wall < rates[-1] <= at_wall * 1.001
    assert 0 < rates[0] < 0.2 * at_wall


def test_a_curve_used_beyond_its_points_is_told(tube):
    assert beyond_table(tube).startswith("the flow curve is used up to")
    wide = ductsolve.FlowCurve([1e-4, 1, 1e4], [1e-3, 1, 1e3])
    inside = ductsolve.solve(ductsolve.circle(0.1), wide, pressure_gradient=GRADIENT)
    assert beyond_table(inside) is None


def test_laws_have_no_end():
    flow = ductsolve.solve(ductsolve.circle(0.1), ductsolve.Newtonian(1.0), pressure_gradient=GRADIENT)
    assert beyond_table(flow) is None
