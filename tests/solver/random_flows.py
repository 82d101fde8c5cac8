"""Strategies that draw fluids of every law and gradients that shear them."""

from __future__ import annotations

import numpy as np
from hypothesis import HealthCheck, settings
from hypothesis import strategies as st

from ductsolve.rheology.laws import (
    Bingham,
    CarreauYasuda,
    Casson,
    Cross,
    Ellis,
    HerschelBulkley,
    Newtonian,
    PowerLaw,
    RobertsonStiff,
    Sisko,
)
from ductsolve.rheology.tabulated import FlowCurve


def modest(examples):
    """The same examples every run, and few: each is a solve."""
    return settings(
        max_examples=examples,
        derandomize=True,
        deadline=None,
        database=None,
        suppress_health_check=[HealthCheck.too_slow],
    )


def between(low, high):
    return st.floats(low, high, allow_nan=False)


def decades(low, high):
    """10 to a power between two, so that all magnitudes are drawn alike."""
    return between(low, high).map(lambda power: 10.0**power)


SIZE = decades(-2, 2)
POWER_LAWS = st.builds(PowerLaw, SIZE, between(0.1, 2.0))
VISCOUS = st.one_of(
    st.builds(Newtonian, SIZE),
    POWER_LAWS,
    st.builds(
        lambda zero, ratio, *rest: CarreauYasuda(zero, zero * ratio, *rest),
        SIZE,
        decades(-5, -1),
        SIZE,
        between(0.1, 1.3),
        between(0.5, 4.0),
    ),
    st.builds(
        lambda zero, ratio, *rest: Cross(zero, zero * ratio, *rest),
        SIZE,
        decades(-5, -1),
        SIZE,
        between(0.3, 0.9),
    ),
    st.builds(Ellis, SIZE, SIZE, between(1.0, 6.0)),
    st.builds(Sisko, SIZE, SIZE, between(0.2, 1.8)),
    st.builds(
        lambda first, slopes: FlowCurve(
            10.0 ** np.arange(-2, len(slopes) - 1), first * 10.0 ** np.cumsum([0.0, *slopes])
        ),
        SIZE,
        st.lists(between(0.2, 1.6), min_size=3, max_size=6),
    ),
)
YIELDING = st.one_of(
    st.builds(Bingham, SIZE, SIZE),
    st.builds(HerschelBulkley, SIZE, SIZE, between(0.2, 1.6)),
    st.builds(Casson, SIZE, SIZE),
    st.builds(RobertsonStiff, SIZE, between(0.3, 1.4), SIZE),
)


ANY = st.one_of(VISCOUS, YIELDING)


@st.composite
def sheared(draw, fluids=ANY, largest_share=0.95):
    """A fluid and a stress at which it is sheared: beyond its yield stress, of which it is a share."""
    fluid = draw(fluids)
    if fluid.yield_stress:
        return fluid, fluid.yield_stress / draw(between(0.02, largest_share))
    return fluid, float(fluid.stress(np.array(draw(decades(-2, 3)))))
