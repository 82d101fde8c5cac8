"""The bracket is never wrong: random fluids, sections and gradients against closed forms and each other."""

from __future__ import annotations

import exact_flows as exact
import pytest
from hypothesis import given
from hypothesis import strategies as st
from published_data import rows
from random_flows import POWER_LAWS, SIZE, VISCOUS, between, decades, modest, sheared
from solver_cases import SECTIONS

from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle
from ductsolve.rheology.laws import Newtonian
from ductsolve.solver.solve import solve

# Flow curves are drawn without regard to how far they must reach.
pytestmark = pytest.mark.filterwarnings("ignore:the flow curve is used")

ACCURACY = decades(-3, -1)
BUDGET = st.integers(50, 1500)
QUADRATURE = 1e-8  # what the exact values here are good for


def check_both_ways(section, fluid, gradient, flow_rate, accuracy, budget, doubt=QUADRATURE):
    """Whatever the status, the answer lies in the bracket, and the best estimate too."""
    forth = solve(section, fluid, pressure_gradient=gradient, accuracy=accuracy, triangle_budget=budget)
    back = solve(section, fluid, flow_rate=flow_rate, accuracy=accuracy, triangle_budget=budget)
    for bracket, estimate, known in (
        (forth.flow_rate_bracket, forth.flow_rate, flow_rate),
        (back.pressure_gradient_bracket, back.pressure_gradient, gradient),
    ):
        low, high = bracket
        assert low <= known * (1 + doubt), f"{known} lies below ({low}, {high}) by {1 - known / low:.1e}"
        assert high >= known * (1 - doubt), f"{known} lies above ({low}, {high}) by {known / high - 1:.1e}"
        assert low <= estimate <= high


@modest(60)
@given(sheared(), SIZE, ACCURACY, BUDGET)
def test_tube(drawn, diameter, accuracy, budget):
    fluid, stress = drawn
    gradient = 4 * stress / diameter
    flow = exact.tube_flow(fluid, diameter, gradient)
    check_both_ways(circle(diameter), fluid, gradient, flow, accuracy, budget)


@modest(60)
@given(sheared(largest_share=0.9), SIZE, between(0.05, 0.98), ACCURACY, BUDGET)
def test_concentric_annulus(drawn, outer, ratio, accuracy, budget):
    fluid, stress = drawn
    gradient = 4 * stress / (outer * (1 - ratio))
    flow = exact.annulus_flow(fluid, outer, ratio * outer, gradient)
    check_both_ways(annulus(outer, ratio * outer), fluid, gradient, flow, accuracy, budget)


@modest(40)
@given(sheared(largest_share=0.9), ACCURACY, BUDGET)
def test_slot(drawn, accuracy, budget):
    """A rectangle a million gaps wide; its ends cost the flow of a few gaps."""
    fluid, stress = drawn
    gradient, flow = 2 * stress, 1e6 * exact.slit_flow(fluid, 1.0, 2 * stress)
    check_both_ways(rectangle(1e6, 1.0), fluid, gradient, flow, accuracy, budget, doubt=1e-5)


@modest(30)
@given(SIZE, SIZE, between(0.02, 1.0), SIZE, ACCURACY)
def test_newtonian_rectangle_and_ellipse(viscosity, width, aspect, gradient, accuracy):
    for make, known in ((rectangle, exact.rectangle_flow), (ellipse, exact.ellipse_flow)):
        flow = known(viscosity, width, aspect * width, gradient)
        section = make(width, aspect * width)
        check_both_ways(section, Newtonian(viscosity), gradient, flow, accuracy, 20_000)


@modest(30)
@given(st.sampled_from(rows("A5_eccentric_annulus_newtonian")), SIZE, SIZE, ACCURACY)
def test_newtonian_eccentric_annulus(found, outer, gradient, accuracy):
    if found["e"] > 0.99:
        return
    section = annulus(outer, found["kappa"] * outer, found["e"])
    flow = found["Q_mu_over_G_Ro4"] * gradient * (outer / 2) ** 4
    check_both_ways(section, Newtonian(1.0), gradient, flow, accuracy, 20_000)


@modest(30)
@given(st.sampled_from(rows("B2_powerlaw_rectangle_fRe")), SIZE, SIZE, ACCURACY, BUDGET)
def test_power_law_rectangle(found, width, consistency, accuracy, budget):
    index, aspect = found["n"], found["aspect"]
    if aspect == 0:
        return
    fluid = exact.PowerLaw(consistency, index)
    gradient = consistency / width
    flow, doubt = exact.published_rectangle_flow(width, aspect, consistency, index, gradient)
    section = rectangle(width, aspect * width)
    check_both_ways(section, fluid, gradient, flow, accuracy, budget, QUADRATURE + doubt * max(1.0, index))


OVERLAPPING = ["square", "ellipse", "eccentric annulus", "L", "one hole", "two holes"]


@modest(40)
@given(st.sampled_from(OVERLAPPING), sheared(largest_share=0.6), st.tuples(ACCURACY, ACCURACY), BUDGET)
def test_brackets_of_any_two_meshes_overlap(name, drawn, accuracies, budget):
    section, (fluid, stress) = SECTIONS[name], drawn
    gradient = 4 * stress / section.hydraulic_diameter
    one, other = (
        solve(section, fluid, pressure_gradient=gradient, accuracy=accuracy, triangle_budget=most)
        for accuracy, most in zip(accuracies, (budget, 600), strict=True)
    )
    assert overlap(one.flow_rate_bracket, other.flow_rate_bracket)


def overlap(one, other):
    return max(one[0], other[0]) <= min(one[1], other[1])


@modest(30)
@given(sheared(largest_share=0.7), between(0.3, 3.0), between(-0.4, 0.4), ACCURACY)
def test_a_rectangle_drawn_as_a_polygon(drawn, height, lean, accuracy):
    """Solved whole on another mesh, turned by any angle."""
    fluid, stress = drawn
    ready = rectangle(1.0, height)
    turn = complex(1.0, lean) / abs(complex(1.0, lean))
    corners = [turn * complex(x, y) for x, y in ((0, 0), (1, 0), (1, height), (0, height))]
    drawn_by_hand = polygon([(corner.real, corner.imag) for corner in corners])
    gradient = 4 * stress / ready.hydraulic_diameter
    one, other = (
        solve(section, fluid, pressure_gradient=gradient, accuracy=accuracy, triangle_budget=1000)
        for section in (ready, drawn_by_hand)
    )
    assert overlap(one.flow_rate_bracket, other.flow_rate_bracket)


@modest(20)
@given(sheared(VISCOUS), between(1.1, 4.0))
def test_more_gradient_means_more_flow(drawn, factor):
    fluid, stress = drawn
    section = SECTIONS["L"]
    flows = [
        solve(section, fluid, pressure_gradient=gradient, accuracy=0.01)
        for gradient in (4 * stress / section.hydraulic_diameter * f for f in (1.0, factor))
    ]
    assert flows[0].flow_rate_bracket[1] < flows[1].flow_rate_bracket[0]


@modest(20)
@given(POWER_LAWS, SIZE)
def test_equilateral_triangle(fluid, side):
    """Newtonian flow is known exactly; a power law's flow grows with the gradient to the 1/n exactly."""
    section = polygon([(0.0, 0.0), (side, 0.0), (side / 2, side * 0.75**0.5)])
    newtonian = solve(section, Newtonian(2.0), pressure_gradient=3.0, accuracy=0.01)
    known = exact.equilateral_flow(2.0, side, 3.0)
    assert newtonian.flow_rate_bracket[0] <= known * (1 + 1e-12)
    assert newtonian.flow_rate_bracket[1] >= known * (1 - 1e-12)
    one, two = (
        solve(section, fluid, pressure_gradient=gradient / side, accuracy=0.02) for gradient in (1.0, 2.0)
    )
    scaled = [bound * 2.0 ** (1 / fluid.index) for bound in one.flow_rate_bracket]
    assert overlap(scaled, two.flow_rate_bracket)
    assert two.flow_rate == pytest.approx(one.flow_rate * 2.0 ** (1 / fluid.index), rel=0.01)
