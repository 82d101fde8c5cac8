"""Shape factors against those of Kozicki, Chou & Tiu (1966)."""

import math

import numpy as np
import pytest
from published_data import rows

import ductsolve
from ductsolve.post.factors import shape_factors

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
