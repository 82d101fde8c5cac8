"""Shear rates of a flow, and how far a tabulated curve is stretched."""

import pytest

import ductsolve
from ductsolve.solver.working import beyond_table, working_rates

GRADIENT = 2000.0


@pytest.fixture(scope="module")
def tube():
    fluid = ductsolve.FlowCurve([1, 3, 10], [3.1, 6.5, 14.2])
    with pytest.warns(ductsolve.DuctsolveWarning):
        return ductsolve.solve(ductsolve.circle(0.1), fluid, pressure_gradient=GRADIENT, accuracy=1e-3)


def test_working_rates_reach_to_the_wall(tube):
    """In a tube the power inside the radius r goes as the integral of rate x r^2."""
    rates = working_rates(tube)
    at_wall = float(tube.fluid.rate(GRADIENT * 0.05 / 2))
    assert 0.95 * at_wall < rates[-1] <= at_wall * 1.001
    assert 0 < rates[0] < 0.2 * at_wall


def test_a_curve_used_beyond_its_points_is_told(tube):
    assert beyond_table(tube).startswith("the flow curve is used up to")
    with pytest.warns(ductsolve.DuctsolveWarning, match="times above its last point.*extrapolated"):
        ductsolve.solve(tube.section, tube.fluid, pressure_gradient=GRADIENT)
    wide = ductsolve.FlowCurve([1e-4, 1, 1e4], [1e-3, 1, 1e3])
    inside = ductsolve.solve(ductsolve.circle(0.1), wide, pressure_gradient=GRADIENT)
    assert beyond_table(inside) is None


def test_laws_have_no_end():
    flow = ductsolve.solve(ductsolve.circle(0.1), ductsolve.Newtonian(1.0), pressure_gradient=GRADIENT)
    assert beyond_table(flow) is None
