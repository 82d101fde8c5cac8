"""Exact and published flows lie inside the bracket, and close to the best estimate, in both directions."""

from __future__ import annotations

import math
from functools import cache
from itertools import product
from typing import NamedTuple

import exact_flows as exact
import pytest
from exact_flows import LAWS
from published_data import row, rows

from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import Section, annulus, circle, ellipse, rectangle
from ductsolve.rheology.laws import Bingham, Newtonian, PowerLaw
from ductsolve.solver.flow import Status
from ductsolve.solver.solve import solve

ACCURACIES = (0.01, 0.001)


class Flow(NamedTuple):
    """A flow known from elsewhere; ``doubt`` is its own relative error."""

    section: Section
    fluid: object
    gradient: float
    flow_rate: float
    doubt: float = 1e-9


def wall_stress(fluid):
    """A stress that shears every law of the table; the yield stress is 0.3 of it."""
    return fluid.yield_stress / 0.3 if fluid.yield_stress else 1.0


def tube(name):
    fluid = LAWS[name]
    gradient = 2 * wall_stress(fluid)
    return Flow(circle(2.0), fluid, gradient, exact.tube_flow(fluid, 2.0, gradient))


# The two ends of a slot cost the flow of a part of it: 0.63 gaps for a Newtonian fluid and, of the fluids
# here, most for the power law of index 0.1, 4.4 gaps by B2_powerlaw_rectangle_fRe at aspect 0.1.
SLOT_WIDTH, END_LOSS = 1e6, 6.0


def slit(name):
    fluid = LAWS[name]
    gradient = 2 * wall_stress(fluid)
    flow = SLOT_WIDTH * exact.slit_flow(fluid, 1.0, gradient)
    return Flow(rectangle(SLOT_WIDTH, 1.0), fluid, gradient, flow, END_LOSS / SLOT_WIDTH)


def concentric(ratio, name):
    fluid = LAWS[name]
    gradient = 2 * wall_stress(fluid) / (1 - ratio)
    return Flow(annulus(2.0, 2 * ratio), fluid, gradient, exact.annulus_flow(fluid, 2.0, 2 * ratio, gradient))


def eccentric_newtonian(ratio, eccentricity):
    """Piercy, Hooper & Winny (1933)."""
    found = row("A5_eccentric_annulus_newtonian", kappa=ratio, e=eccentricity)["Q_mu_over_G_Ro4"]
    return Flow(annulus(2.0, 2 * ratio, eccentricity), Newtonian(0.5), 3.0, found * 3.0 / 0.5)


def eccentric_power_law(ratio, eccentricity, index):
    found = row("B4_powerlaw_eccentric_annulus", kappa=ratio, e=eccentricity, n=index)
    section = annulus(2.0, 2 * ratio, eccentricity)
    return Flow(section, PowerLaw(1.0, index), 1.0, found["Q_dim"], found["rel_err"])


def rectangle_power_law(aspect, index):
    flow, doubt = exact.published_rectangle_flow(1.0, aspect, 1.0, index, 1.0)
    return Flow(rectangle(1.0, aspect), PowerLaw(1.0, index), 1.0, flow, doubt)


def rectangle_newtonian(aspect):
    found = row("A1_rect_newtonian", aspect=aspect)["fRe_Fanning"]
    velocity = exact.mean_velocity(found, 2 * aspect / (1 + aspect), 1.0, 1.0, 1.0)
    return Flow(rectangle(1.0, aspect), Newtonian(1.0), 1.0, velocity * aspect)


def rectangle_bingham(aspect, yield_number):
    """Half the short side, gradient and plastic viscosity are 1 in the table."""
    found = row("C4_bingham_rect_duct", aspect=aspect, Od=yield_number)
    doubt = found["err"] / found["Q_extrap"]
    return Flow(rectangle(2 / aspect, 2.0), Bingham(yield_number, 1.0), 1.0, found["Q_extrap"], doubt)


def polygon_power_law(sides, index):
    """Regular polygon of circumradius 1, from the table of f Re_K."""
    found = row("B5_powerlaw_other_shapes", shape="regular_polygon", parameter=sides, n=index)
    corners = [(math.cos(2 * math.pi * k / sides), math.sin(2 * math.pi * k / sides)) for k in range(sides)]
    section = polygon(corners)
    velocity = exact.mean_velocity(found["fRe_K"], section.hydraulic_diameter, 1.0, index, 1.0)
    doubt = 1e-8 + found["err"] / found["fRe_K"] / index
    return Flow(section, PowerLaw(1.0, index), 1.0, velocity * section.area, doubt)


def ellipse_newtonian(aspect):
    return Flow(ellipse(1.0, aspect), Newtonian(0.3), 2.0, exact.ellipse_flow(0.3, 1.0, aspect, 2.0))


ANNULUS_LAWS = (
    "Newtonian",
    "power law 0.2",
    "power law 0.5",
    "power law 2",
    "Bingham",
    "Herschel-Bulkley 0.5",
)
SQUARE_INDICES = [r["n"] for r in rows("B2_powerlaw_rectangle_fRe") if r["aspect"] == 1.0]

# What makes each flow, and the arguments to make it with.
TABLE = {
    tube: [(name,) for name in LAWS],
    slit: [(name,) for name in LAWS],
    concentric: list(product((0.1, 0.5, 0.9, 0.99), ANNULUS_LAWS)),
    rectangle_newtonian: [(1.0,), (0.75,), (0.5,), (0.2,), (0.05,)],
    ellipse_newtonian: [(1.0,), (0.9,), (0.5,), (0.1,)],
    eccentric_newtonian: list(product((0.1, 0.5, 0.95), (0.1, 0.5, 0.9, 0.99))),
    rectangle_power_law: [(1.0, n) for n in SQUARE_INDICES]
    + list(product((0.5, 0.25, 0.1), (0.1, 0.5, 2.0))),
    eccentric_power_law: [(*a, n) for a in ((0.2, 0.2), (0.5, 0.6), (0.8, 0.9)) for n in (0.2, 0.5, 0.8)],
    rectangle_bingham: [(1.0, 0.05), (1.0, 0.1), (0.5, 0.1), (0.5, 0.2), (0.25, 0.1)],
    polygon_power_law: list(product((3, 6), (0.2, 0.5, 1.0))),
}
FLOWS = {
    " ".join(map(str, [make.__name__, *values])): (make, values)
    for make, table in TABLE.items()
    for values in table
}


@cache
def known_flow(name):
    make, values = FLOWS[name]
    return make(*values)


def agrees(bracket, estimate, exact_value, accuracy, doubt):
    low, high = bracket
    assert low <= exact_value * (1 + doubt)
    assert high >= exact_value * (1 - doubt)
    assert (high - low) / (high + low) <= accuracy
    assert low <= estimate <= high
    assert abs(estimate / exact_value - 1) <= accuracy / 10 + 1e-5 + doubt


@pytest.mark.parametrize("accuracy", ACCURACIES)
@pytest.mark.parametrize("name", FLOWS)
def test_flow_rate(name, accuracy):
    known = known_flow(name)
    flow = solve(known.section, known.fluid, pressure_gradient=known.gradient, accuracy=accuracy)
    assert flow.status is Status.ANSWERED
    assert flow.pressure_gradient_bracket == (known.gradient, known.gradient)
    agrees(flow.flow_rate_bracket, flow.flow_rate, known.flow_rate, accuracy, known.doubt)


@pytest.mark.parametrize("accuracy", ACCURACIES)
@pytest.mark.parametrize("name", FLOWS)
def test_pressure_gradient(name, accuracy):
    known = known_flow(name)
    flow = solve(known.section, known.fluid, flow_rate=known.flow_rate, accuracy=accuracy)
    # A fluid's gradient changes by at most the largest local exponent times as much as the flow rate.
    doubt = known.doubt * known.fluid.exponent_bound
    assert flow.status is Status.ANSWERED
    assert flow.flow_rate_bracket == (known.flow_rate, known.flow_rate)
    agrees(flow.pressure_gradient_bracket, flow.pressure_gradient, known.gradient, accuracy, doubt)
