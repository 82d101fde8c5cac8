"""Shape factors against those of Kozicki, Chou & Tiu (1966), and the peak of a velocity between nodes."""

import math

import numpy as np
import pytest
from published_data import rows

import ductsolve
from ductsolve.post.factors import _inner_peak, _side_peak, peak_velocity, shape_factors

# The peak velocity behind a is that of a point, less exact than the flow rate behind a + b.
OF_A, OF_SUM = 2e-3, 2e-4


def section(shape, parameter):
    """Section of a row of the table of Kozicki's constants, None where there is no such section here."""
    if shape == "rectangle" and parameter:
        return ductsolve.rectangle(1.0, parameter)
    if shape == "ellipse" and parameter:
        return ductsolve.ellipse(1.0, parameter)
    if shape == "annulus" and parameter >= 0.05:
        return ductsolve.annulus(1.0, parameter)
    if shape == "regular_polygon" and parameter <= 6:
        angles = 2 * math.pi * np.arange(parameter) / parameter
        return ductsolve.polygon(np.column_stack([np.cos(angles), np.sin(angles)]))
    return None


TABLE = [
    (row["shape"], row["parameter"], row["a"], row["b"])
    for row in rows("B3_kozicki_constants")
    if row["shape"] in ("rectangle", "ellipse", "annulus", "regular_polygon")
    and 0.05 <= row["parameter"] <= 6
    and row["parameter"] in (0.05, 0.1, 0.25, 0.5, 0.9, 1, 3, 4, 6)
]


@pytest.mark.parametrize(("shape", "parameter", "a", "b"), TABLE)
def test_kozicki_constants(shape, parameter, a, b):
    factors = shape_factors(section(shape, parameter))
    assert factors.a == pytest.approx(a, rel=OF_A)
    assert factors.a + factors.b == pytest.approx(a + b, rel=OF_SUM)


def test_factors_do_not_depend_on_size():
    small, large = (shape_factors(ductsolve.ellipse(2e-3 * k, 1e-3 * k)) for k in (1, 1000))
    assert small.friction == pytest.approx(large.friction, rel=1e-9)
    assert small.peak == pytest.approx(large.peak, rel=1e-9)


def test_circle_is_exact():
    factors = shape_factors(ductsolve.circle(0.1))
    assert (factors.friction, factors.peak) == pytest.approx((16, 2), rel=1e-5)


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


def test_peak_is_at_least_the_largest_node():
    flow = ductsolve.solve(ductsolve.annulus(0.06, 0.04), ductsolve.PowerLaw(1.0, 0.6), flow_rate=1e-3)
    assert peak_velocity(flow) >= flow.max_velocity
    # Fredrickson & Bird (1958), by way of the table in tests/published.
    exact = next(
        row for row in rows("B1_powerlaw_concentric_annulus") if (row["kappa"], row["n"]) == (0.7, 0.6)
    )
    similar = ductsolve.solve(ductsolve.annulus(1, 0.7), ductsolve.PowerLaw(1.0, 0.6), flow_rate=1.0)
    assert peak_velocity(similar) / similar.mean_velocity == pytest.approx(exact["umax_over_U"], rel=5e-3)
