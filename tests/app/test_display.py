"""Numbers as text: a guaranteed bound stays one."""

import math
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ductsolve.app.case import ReportUnit
from ductsolve.app.display import (
    DOWN,
    UP,
    Display,
    digits_for,
    figures,
    half_width_text,
    percent,
)

positive = st.floats(1e-250, 1e250)


@given(positive, st.integers(1, 12))
def test_bounds_are_rounded_outward(value, digits):
    low, high = (Fraction(figures(value, digits, way)) for way in (DOWN, UP))
    assert low <= Fraction(repr(value)) <= high
    assert float(high - low) <= 10.0 ** (1 - digits) * value * (1 + 1e-9)


@given(positive, st.integers(1, 12))
def test_padding_changes_nothing_but_zeros(value, digits):
    assert Fraction(figures(value, digits)) == Fraction(figures(value, digits, padded=True))


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [
        (0.0, 5, "0"),
        (-0.0, 5, "0"),
        (1234567.0, 5, "1234600"),
        (12345678.0, 5, "1.2346e7"),
        (0.00012345, 3, "0.000123"),
        (0.000012345, 3, "1.23e-5"),
        (99999.6, 5, "100000"),
        (0.6, 5, "0.6"),
        (-4.186, 4, "-4.186"),
        (math.inf, 5, "without bound"),
        (math.nan, 5, "unknown"),
    ],
)
def test_figures(value, digits, text):
    assert figures(value, digits) == text


def test_padded_ends_line_up():
    assert figures(20.86, 5, padded=True) == "20.860"


@pytest.mark.parametrize(
    ("width", "digits"), [(0.01, 5), (1e-4, 6), (1e-7, 9), (1e-30, 12), (None, 5), (0.0, 5), (1.0, 5)]
)
def test_enough_digits_to_tell_the_ends_apart(width, digits):
    assert digits_for(width) == digits


@settings(deadline=None)  # units are loaded on the way
@given(st.floats(1e-7, 0.5), st.floats(1e-6, 1e9))
def test_ends_of_a_bracket_differ_as_text(width, value):
    ends = (value * (1 - width), value, value * (1 + width))
    texts = Display().bracket(*ends, "stress", digits_for(width))
    assert len({si for si, _ in texts}) == 3
    assert len({unit for _, other in texts for unit in other.split()[1:]}) <= 1


def test_half_widths_are_rounded_up():
    assert half_width_text(0.0195701) == "+/- 1.96 %"
    assert half_width_text(None) == "without bound"
    assert percent(0.0195701) == "2 %"


def test_units_of_the_case_come_first():
    display = Display((ReportUnit("flow_rate", "kg/h", 2736000.0),))
    assert display.both(5e-5, "flow_rate") == ("5e-5 m^3/s", "136.8 kg/h")
    assert display.both(2.5e7, "pressure_gradient") == ("2.5e7 Pa/m", "25 MPa/m")
    assert display.both(2.0, "velocity") == ("2 m/s", "")


def test_a_bracket_keeps_to_one_unit():
    texts = Display().bracket(0.99e6, 1e6, 1.01e6, "stress")
    assert [other for _, other in texts] == ["0.99000 MPa", "1.0000 MPa", "1.0100 MPa"]


def test_a_bracket_without_an_upper_end():
    low, best, high = Display().bracket(0.0, 2.0, math.inf, "stress")
    assert (low[0], best[0], high) == ("0 Pa", "2.0000 Pa", ("without bound", ""))


def test_places_have_no_rounding_noise():
    assert Display(extent=0.02).place((1e-18, -0.0125)) == "(0, -12.5) mm"
