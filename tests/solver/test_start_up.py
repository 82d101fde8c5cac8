"""The gradient that starts a yield-stress fluid, against the known limits of no flow."""

from __future__ import annotations

import math

import pytest
from published_data import rows

from ductsolve.errors import DutyError, FluidError
from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle
from ductsolve.solver.startup import start_up_gradient

YIELD_STRESS = 3.0


def regular(sides):
    """Regular polygon of inradius 1."""
    outer = 1 / math.cos(math.pi / sides)
    return polygon(
        [(outer * math.cos(a), outer * math.sin(a)) for a in (2 * math.pi * k / sides for k in range(sides))]
    )


# Names of the published table, whose h is the start-up gradient over the yield stress.
SECTIONS = {
    "rectangle short side 1, aspect 1": lambda: rectangle(1.0, 1.0),
    "rectangle short side 1, aspect 0.75": lambda: rectangle(1.0, 4 / 3),
    "rectangle short side 1, aspect 0.5": lambda: rectangle(2.0, 1.0),
    "rectangle short side 1, aspect 0.25": lambda: rectangle(4.0, 1.0),
    "rectangle short side 1, aspect 0.1": lambda: rectangle(10.0, 1.0),
    "equilateral triangle side 1": lambda: polygon([(0, 0), (1, 0), (0.5, math.sqrt(0.75))]),
    "right isosceles legs 1": lambda: polygon([(0, 0), (1, 0), (0, 1)]),
    "regular 6-gon inradius 1": lambda: regular(6),
    "circle R=1": lambda: circle(2.0),
    "ellipse a=1 b=0.8 (self-Cheeger=True)": lambda: ellipse(2.0, 1.6),
    "ellipse a=1 b=0.25 (self-Cheeger=False)": lambda: ellipse(2.0, 0.5),
    "concentric annulus Ro=1 kappa=0.1": lambda: annulus(2.0, 0.2),
    "concentric annulus Ro=1 kappa=0.5": lambda: annulus(2.0, 1.0),
    "concentric annulus Ro=1 kappa=0.9": lambda: annulus(2.0, 1.8),
}
LIMITS = {row["shape"]: row["h"] for row in rows("C3_critical_yield")}


# The sharp corners of the right triangle need a minute to 0.1 %.
CASES = [(shape, a) for a in (0.01, 0.001) for shape in SECTIONS if a == 0.01 or "right" not in shape]


@pytest.mark.parametrize("shape, accuracy", CASES)
def test_bracket_and_estimate(shape, accuracy):
    found = start_up_gradient(SECTIONS[shape](), YIELD_STRESS, accuracy=accuracy)
    low, high = found.bracket
    known = YIELD_STRESS * LIMITS[shape]
    # Thirteen digits are given; bounds may touch the limit (a circle's, an annulus's).
    assert low <= known * (1 + 1e-11)
    assert high >= known * (1 - 1e-11)
    assert found.reached
    assert (high - low) / (high + low) <= accuracy
    assert low <= found.estimate <= high
    assert abs(found.estimate / known - 1) <= accuracy / 10 + 1e-5


@pytest.mark.parametrize("scale", [1e-3, 50.0])
def test_scales_with_yield_stress_over_length(scale):
    small = start_up_gradient(rectangle(1.0, 1.0), 1.0).bracket
    scaled = start_up_gradient(rectangle(scale, scale), 7.0).bracket
    assert scaled == pytest.approx([7.0 / scale * bound for bound in small], rel=1e-6)


@pytest.mark.parametrize("yield_stress", [0.0, -1.0, math.nan, math.inf, "3"])
def test_refuses_a_yield_stress_that_is_none(yield_stress):
    with pytest.raises(FluidError, match="yield_stress must be positive"):
        start_up_gradient(circle(1.0), yield_stress)


@pytest.mark.parametrize("accuracy", [0.0, 1.0, math.nan, -0.1, "1"])
def test_refuses_an_accuracy_out_of_range(accuracy):
    with pytest.raises(DutyError, match="accuracy must lie between"):
        start_up_gradient(circle(1.0), 1.0, accuracy=accuracy)
