"""Yield-stress fluids: accuracy towards no flow, no flow proved, and the plug."""

from __future__ import annotations

import math
from functools import cache
from itertools import product

import exact_flows as exact
import numpy as np
import pytest
from published_data import row
from scipy.optimize import brentq

from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle
from ductsolve.rheology.laws import Bingham, Casson, HerschelBulkley, RobertsonStiff
from ductsolve.solver.flow import Status
from ductsolve.solver.solve import solve
from ductsolve.solver.startup import start_up_gradient

SECTIONS = {
    "square": rectangle(1.0, 1.0),
    "rectangle": rectangle(4.0, 1.0),
    "annulus": annulus(2.0, 1.0),
    "eccentric annulus": annulus(2.0, 1.0, 0.8),
}
LAWS = {"Bingham": Bingham(1.0, 1.0), "Herschel-Bulkley": HerschelBulkley(1.0, 1.0, 0.5)}


# Shares of the gradient that starting takes, and the accuracy asked there. In the eccentric annulus a Bingham
# fluid at 0.8 needs 15,000 triangles, too many for a test.
SHARES = ((0.3, 0.001), (0.8, 0.01))
CASES = [
    (name, law, *share)
    for name, law, share in product(SECTIONS, LAWS, SHARES)
    if (name, law, share[0]) != ("eccentric annulus", "Bingham", 0.8)
]


@cache
def start_up(name):
    """Gradient that starts a yield stress of 1: known (C3_critical_yield names its sources), or computed."""
    known = {
        "square": 2 + math.sqrt(math.pi),
        "rectangle": (5 + math.sqrt(9 + 4 * math.pi)) / 4,
        "annulus": 4.0,
        "circle": 2.0,
    }
    return known[name] if name in known else start_up_gradient(SECTIONS[name], 1.0).estimate


@cache
def flow_at(name, law, share, accuracy):
    """Flow at a gradient of which the start-up gradient is this share."""
    return solve(SECTIONS[name], LAWS[law], pressure_gradient=start_up(name) / share, accuracy=accuracy)


def half_width(bracket):
    return (bracket[1] - bracket[0]) / (bracket[1] + bracket[0])


@pytest.mark.parametrize("name, law, share, accuracy", CASES)
def test_flow_rate(name, law, share, accuracy):
    flow = flow_at(name, law, share, accuracy)
    assert flow.status is Status.ANSWERED
    assert half_width(flow.flow_rate_bracket) <= accuracy
    if name == "annulus":
        known = exact.annulus_flow(LAWS[law], 2.0, 1.0, flow.pressure_gradient)
        assert flow.flow_rate_bracket[0] <= known <= flow.flow_rate_bracket[1]
        assert flow.flow_rate == pytest.approx(known, rel=accuracy / 10 + 1e-5)


@pytest.mark.parametrize("name, law, share, accuracy", CASES)
def test_pressure_gradient(name, law, share, accuracy):
    there = flow_at(name, law, share, accuracy)
    back = solve(SECTIONS[name], LAWS[law], flow_rate=there.flow_rate, accuracy=0.005)
    low, high = back.pressure_gradient_bracket
    assert back.status is Status.ANSWERED
    assert half_width((low, high)) <= 0.005
    # The true flow rate lay in its bracket, and d ln G/d ln Q <= 1 for these laws.
    least, most = there.flow_rate_bracket
    assert low <= there.pressure_gradient * there.flow_rate / least
    assert high >= there.pressure_gradient * there.flow_rate / most


@pytest.mark.parametrize("share", [0.9, 0.95])
@pytest.mark.parametrize("law", LAWS)
def test_pressure_gradient_near_no_flow(law, share):
    gradient = start_up("annulus") / share
    known = exact.annulus_flow(LAWS[law], 2.0, 1.0, gradient)
    back = solve(SECTIONS["annulus"], LAWS[law], flow_rate=known, accuracy=0.005)
    low, high = back.pressure_gradient_bracket
    assert back.status is Status.ANSWERED
    assert low <= gradient <= high
    assert half_width((low, high)) <= 0.005


@pytest.mark.parametrize("yield_number", [0.2, 0.3, 0.4, 0.45])
def test_bingham_in_a_square_against_the_published_flow(yield_number):
    """Half the side, gradient and plastic viscosity are 1 in the table; to 1 % up to 0.8 of no flow."""
    found = row("C4_bingham_rect_duct", aspect=1.0, Od=yield_number)
    flow = solve(
        rectangle(2.0, 2.0),
        Bingham(yield_number, 1.0),
        pressure_gradient=1.0,
        accuracy=0.01,
        triangle_budget=2000,
    )
    low, high = flow.flow_rate_bracket
    assert (flow.status is Status.ANSWERED) or found["frac_of_critical"] > 0.8
    assert low - found["err"] <= found["Q_extrap"] <= high + found["err"]


SHAPES = {
    **SECTIONS,
    "circle": circle(2.0),
    "ellipse": ellipse(2.0, 1.0),
    "triangle": polygon([(0.0, 0.0), (2.0, 0.0), (0.5, 1.5)]),
    "holed": polygon([(0, 0), (3, 0), (3, 2), (0, 2)], holes=[[(1, 0.8), (2, 0.8), (2, 1.3), (1, 1.3)]]),
}
RESTING = {
    "Bingham": Bingham(1.0, 1.0),
    "Herschel-Bulkley": HerschelBulkley(1.0, 0.2, 0.4),
    "Casson": Casson(1.0, 3.0),
    "Robertson-Stiff": RobertsonStiff(1.0, 0.5, 1.0),
}


@cache
def proved_start_up(name):
    """A gradient that certainly does not start a yield stress of 1, within 1 % of the limit."""
    return start_up_gradient(SHAPES[name], 1.0, accuracy=0.005).bracket[0]


@pytest.mark.parametrize("share", [0.01, 0.5, 0.98])
@pytest.mark.parametrize("name", SHAPES)
def test_no_flow_is_proved(name, share):
    rests(SHAPES[name], LAWS["Bingham"], share * proved_start_up(name))


@pytest.mark.parametrize("law", RESTING)
def test_no_flow_is_proved_whatever_the_law_beyond_yield(law):
    rests(SHAPES["square"], RESTING[law], 0.95 * start_up("square"))


def rests(section, fluid, gradient):
    flow = solve(section, fluid, pressure_gradient=gradient)
    assert flow.status is Status.NO_FLOW
    assert flow.flow_rate == 0
    assert flow.flow_rate_bracket == (0.0, 0.0)
    assert flow.pressure_gradient_bracket == (gradient, gradient)
    assert not flow.velocity.any()
    assert flow.plug.proved == flow.plug_fraction == 1
    shear = flow.wall_shear
    assert shear.stress @ shear.length == pytest.approx(gradient * section.area, rel=1e-12)


@pytest.mark.parametrize("offset", [-1e-5, 1e-5])
def test_too_near_to_tell(offset):
    section, fluid = SECTIONS["square"], LAWS["Bingham"]
    flow = solve(section, fluid, pressure_gradient=start_up("square") * (1 + offset), triangle_budget=500)
    assert flow.status is Status.UNDECIDED
    assert flow.flow_rate == flow.flow_rate_bracket[0] == 0
    # Flow grows at most like that of the plug-free fluid, whose excess of the gradient is 1e-5 of it.
    assert 0 < flow.flow_rate_bracket[1] < 0.01 * exact.rectangle_flow(1.0, 1.0, 1.0, start_up("square"))


@pytest.mark.parametrize("share", [0.9, 0.95, 0.99])
@pytest.mark.parametrize("law", LAWS)
def test_a_used_up_budget_is_said_and_the_bracket_is_true(law, share):
    gradient = start_up("annulus") / share
    known = exact.annulus_flow(LAWS[law], 2.0, 1.0, gradient)
    flow = solve(
        SECTIONS["annulus"], LAWS[law], pressure_gradient=gradient, accuracy=1e-4, triangle_budget=200
    )
    low, high = flow.flow_rate_bracket
    assert flow.status is Status.BUDGET
    assert "triangle" in flow.status.value
    assert low <= known <= high < math.inf
    assert half_width((low, high)) > 1e-4
    assert flow.history[-1].half_width == pytest.approx(half_width((low, high)))


def slow_share(stress_share, flow):
    """Share of a tube's area that shears no faster than the proof of the plug speaks of."""
    slow_stress = float(flow.fluid.stress(np.array(flow.plug.slow_rate)))
    return (stress_share * slow_stress / flow.fluid.yield_stress) ** 2


@pytest.mark.parametrize("law", LAWS)
@pytest.mark.parametrize("share", [0.3, 0.6, 0.8])
def test_plug_of_a_tube(law, share):
    """The plug's radius is ``share`` of the tube's: the stress rises linearly from the axis."""
    coarse, fine = (
        solve(SHAPES["circle"], LAWS[law], pressure_gradient=2.0 / share, accuracy=accuracy)
        for accuracy in (0.01, 0.002)
    )
    for flow in (coarse, fine):
        # The points that a triangle is sampled at look yielded or not.
        assert flow.plug.apparent == pytest.approx(share**2, abs=0.02)
        assert flow.plug_fraction == flow.plug.apparent
        assert 0 <= flow.plug.proved <= slow_share(share, flow)
    assert coarse.plug.proved <= fine.plug.proved
    assert fine.plug.proved > 0.5 * share**2 or share < 0.5


@pytest.mark.parametrize("law", LAWS)
def test_plug_of_an_annulus(law):
    """From L_i to L_i + T0 by Fredrickson & Bird (1958), Hanks (1979)."""
    found = row(
        "C2_bingham_HB_concentric_annulus", kappa=0.5, n=LAWS[law].index, **{"T0_over_(1-kappa)": 0.5}
    )
    plug = (found["lambda_o"] ** 2 - found["lambda_i"] ** 2) / 0.75
    flow = solve(SECTIONS["annulus"], LAWS[law], pressure_gradient=8.0, accuracy=0.01)
    assert flow.plug.apparent == pytest.approx(plug, abs=0.02)
    assert flow.plug.proved < flow.plug.apparent


def test_no_plug_without_yield_stress():
    flow = solve(SECTIONS["square"], Bingham(0.0, 1.0), pressure_gradient=1.0)
    assert flow.plug.proved == flow.plug.apparent == 0


@pytest.mark.parametrize("flow_rate", [1e-12, 1e-8])
def test_a_trickle_takes_little_more_than_the_start_up_gradient(flow_rate):
    """Buckingham (1921) and Reiner (1926), solved for the gradient."""
    radius, law = 0.01, Bingham(10.0, 0.01)

    def excess(gradient):
        phi = 2 * law.yield_stress / (gradient * radius)
        viscous = math.pi * radius**4 * gradient / (8 * law.plastic_viscosity)
        return viscous * (1 - 4 * phi / 3 + phi**4 / 3) - flow_rate

    exact_gradient = brentq(excess, 2000 * (1 + 1e-12), 4000)
    flow = solve(circle(2 * radius), law, flow_rate=flow_rate)
    low, high = flow.pressure_gradient_bracket
    assert flow.status is Status.ANSWERED
    assert low <= exact_gradient <= high
    assert half_width((low, high)) <= 0.01
