"""Largest value of a quadratic field, between its nodes too."""

import numpy as np
import pytest
from published_data import rows

import ductsolve
from ductsolve.solver.peak import _inner_peak, _side_peak


def nodal(function):
    """Values of a function of the reference coordinates at the nodes of one triangle, (1, 6)."""
    places = np.array([(0, 0), (1, 0), (0, 1), (0.5, 0), (0.5, 0.5), (0, 0.5)])
    return np.array([[function(x, y) for x, y in places]])


def test_peak_inside_a_triangle_is_found_exactly():
    hill = nodal(lambda x, y: 3 - 2 * (x - 0.3) ** 2 - (x - 0.3) * (y - 0.2) - 4 * (y - 0.2) ** 2)
    assert _inner_peak(hill) == pytest.approx(3, rel=1e-14)


@pytest.mark.parametrize(
    "field",
    [
        lambda x, y: 3 + (x - 0.3) ** 2 + (y - 0.2) ** 2,  # a bowl
        lambda x, y: 3 + (x - 0.3) ** 2 - (y - 0.2) ** 2,  # a saddle
        lambda x, y: 3 - (x - 0.8) ** 2 - (y - 0.9) ** 2,  # a hill outside
        lambda x, y: x + y,  # a slope
    ],
)
def test_no_peak_inside(field):
    assert _inner_peak(nodal(field)) == 0


def test_peak_on_a_side():
    start, middle, end = (np.array([1 - (x - 0.3) ** 2]) for x in (0.0, 0.5, 1.0))
    assert _side_peak(start, middle, end) == pytest.approx(1, rel=1e-14)
    assert _side_peak(np.array([0.0]), np.array([0.5]), np.array([1.0])) == 0


def test_largest_velocity_is_at_least_the_largest_at_a_node():
    flow = ductsolve.solve(ductsolve.annulus(1, 0.7), ductsolve.PowerLaw(1.0, 0.6), flow_rate=1.0)
    assert flow.max_velocity >= flow.velocity.max()
    # Fredrickson & Bird (1958), by way of the table in tests/published.
    exact = next(
        row for row in rows("B1_powerlaw_concentric_annulus") if (row["kappa"], row["n"]) == (0.7, 0.6)
    )
    assert flow.max_velocity / flow.mean_velocity == pytest.approx(exact["umax_over_U"], rel=5e-3)
