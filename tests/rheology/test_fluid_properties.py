"""What holds for every fluid, on drawn parameters and arguments."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ductsolve.errors import FluidError
from ductsolve.rheology.laws import (
    CarreauYasuda,
    Casson,
    Cross,
    Ellis,
    HerschelBulkley,
    PowerLaw,
    RobertsonStiff,
    Sisko,
)
from ductsolve.rheology.tabulated import FlowCurve

pytestmark = pytest.mark.filterwarnings("error")

drawn = settings(max_examples=150, deadline=None, derandomize=True)


def logarithmic(low, high):
    return st.floats(np.log(low), np.log(high)).map(lambda value: float(np.exp(value)))


size, index = logarithmic(1e-3, 1e3), st.floats(0.1, 2.0)
below_one = st.one_of(st.just(0.0), logarithmic(1e-6, 1.0))


@st.composite
def flow_curves(draw):
    steps = draw(st.lists(st.tuples(st.floats(0.1, 3.0), st.floats(0.05, 1.5)), min_size=1, max_size=12))
    log_rate = np.cumsum([0.0, *(width for width, _ in steps)]) - 5.0
    log_stress = np.cumsum([0.0, *(width * slope for width, slope in steps)])
    return FlowCurve(np.exp(log_rate), np.exp(log_stress))


@st.composite
def carreau_yasuda(draw):
    zero = draw(size)
    return CarreauYasuda(zero, draw(below_one) * zero, draw(size), draw(index), draw(st.floats(0.2, 5.0)))


@st.composite
def cross(draw):
    zero = draw(size)
    return Cross(zero, draw(below_one) * zero, draw(size), draw(st.floats(0.2, 0.95)))


maybe = st.one_of(st.just(0.0), size)
fluids = st.one_of(
    st.builds(PowerLaw, size, index),
    st.builds(HerschelBulkley, maybe, size, index),
    st.builds(Casson, maybe, size),
    carreau_yasuda(),
    cross(),
    st.builds(Ellis, size, size, st.floats(1.0, 8.0)),
    st.builds(Sisko, maybe, size, index),
    st.builds(RobertsonStiff, size, index, maybe),
    flow_curves(),
)
decades = st.floats(-6.0, 6.0).map(lambda value: 10.0**value)
tilts = st.tuples(st.floats(-0.5, 0.5), st.floats(0.05, 3.0))


def assert_conjugate(fluid, rate, stress):
    """F + F* >= rate * stress for any pair, equal on the curve, and the inverse inverts."""
    assert fluid.potential(rate) + fluid.complementary(stress) >= rate * stress * (1.0 - 1e-13)
    on_curve = fluid.stress(rate)
    both = fluid.potential(rate) + fluid.complementary(on_curve)
    assert both == pytest.approx(rate * on_curve, rel=1e-12)
    lost_digits = (on_curve - fluid.yield_stress) / on_curve * fluid.local_exponent(rate)
    assert abs(fluid.rate(on_curve) / rate - 1.0) * lost_digits < 1e-13
    assert 0.0 <= fluid.local_exponent(rate) <= fluid.exponent_bound * (1.0 + 1e-12)


@drawn
@given(fluids, decades, decades)
def test_conjugacy(fluid, rate, stress):
    assert_conjugate(fluid, rate, stress)


@drawn
@given(fluids, tilts, decades, decades)
def test_conjugacy_of_tilted_fluids(fluid, tilt, rate, stress):
    try:
        tilted = fluid.tilted(*tilt)
    except FluidError:
        return
    factor = 1.0 + tilt[0] - tilt[0] / tilt[1] * fluid.local_exponent(rate)
    assert tilted.stress(rate) == pytest.approx(fluid.stress(rate) * factor, rel=1e-10)
    assert_conjugate(tilted, rate, stress)


@drawn
@given(fluids, decades, st.floats(1e-3, 10.0))
def test_curves_rise_no_faster_than_their_bound(fluid, rate, step):
    ratio = fluid.stress(rate * (1.0 + step)) / fluid.stress(rate)
    assert 1.0 <= ratio <= (1.0 + step) ** fluid.exponent_bound * (1.0 + 1e-12)


@drawn
@given(fluids, st.lists(decades, min_size=2, max_size=30))
def test_answers_do_not_depend_on_company(fluid, stresses):
    """An array is answered as its members are one by one."""
    together = fluid.rate(np.array(stresses))
    alone = np.array([fluid.rate(stress) for stress in stresses])
    np.testing.assert_allclose(together, alone, rtol=1e-11)
