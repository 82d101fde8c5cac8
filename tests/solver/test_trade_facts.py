"""What every engineer in the trade expects (common practice, no source), and exact scaling laws."""

from __future__ import annotations

import math

import numpy as np
import pytest
from solver_cases import L_CORNERS, SECTIONS

from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle
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
from ductsolve.solver.solve import solve

SHAPES = ["square", "ellipse", "concentric annulus", "eccentric annulus", "L"]
VISCOSITY = 0.7

NEWTONIAN_LIMITS = {
    "power law": PowerLaw(VISCOSITY, 1.0),
    "Bingham": Bingham(0.0, VISCOSITY),
    "Herschel-Bulkley": HerschelBulkley(0.0, VISCOSITY, 1.0),
    "Casson": Casson(0.0, VISCOSITY),
    "Carreau-Yasuda, no thinning": CarreauYasuda(VISCOSITY, 0.0, 2.0, 1.0),
    "Carreau-Yasuda, equal plateaus": CarreauYasuda(VISCOSITY, VISCOSITY, 2.0, 0.4),
    "Carreau-Yasuda, first plateau": CarreauYasuda(VISCOSITY, 0.0, 1e-9, 0.4),
    "Cross, equal plateaus": Cross(VISCOSITY, VISCOSITY, 2.0, 0.7),
    "Cross, first plateau": Cross(VISCOSITY, 0.0, 1e-9, 0.9),
    "Ellis": Ellis(2 * VISCOSITY, 1.0, 1.0),
    "Ellis, first plateau": Ellis(VISCOSITY, 1e9, 2.5),
    "Sisko, no power law": Sisko(VISCOSITY, 0.0, 0.4),
    "Sisko, index 1": Sisko(VISCOSITY / 2, VISCOSITY / 2, 1.0),
    "Robertson-Stiff": RobertsonStiff(VISCOSITY, 1.0, 0.0),
    "flow curve": FlowCurve([0.1, 1.0, 10.0], [0.1 * VISCOSITY, VISCOSITY, 10 * VISCOSITY]),
}


def both(accuracy):
    """How far two best estimates of the same flow may lie apart."""
    return 2 * (accuracy / 10 + 1e-5)


def overlap(one, other):
    return max(one[0], other[0]) <= min(one[1], other[1])


@pytest.mark.parametrize("law", NEWTONIAN_LIMITS)
@pytest.mark.parametrize("name", ["square", "eccentric annulus"])
def test_newtonian_limit_of_every_law(name, law):
    newtonian, limit = (
        solve(SECTIONS[name], fluid, pressure_gradient=2.0, accuracy=1e-3)
        for fluid in (Newtonian(VISCOSITY), NEWTONIAN_LIMITS[law])
    )
    assert overlap(newtonian.flow_rate_bracket, limit.flow_rate_bracket)
    assert limit.flow_rate == pytest.approx(newtonian.flow_rate, rel=both(1e-3))
    back = solve(SECTIONS[name], NEWTONIAN_LIMITS[law], flow_rate=newtonian.flow_rate, accuracy=1e-3)
    assert back.pressure_gradient == pytest.approx(2.0, rel=both(1e-3))


@pytest.mark.parametrize("name", SHAPES)
def test_the_profile_flattens_as_the_index_falls(name):
    indices = (1.5, 1.0, 0.7, 0.4, 0.2, 0.1)
    flows = [solve(SECTIONS[name], PowerLaw(1.0, n), pressure_gradient=20.0, accuracy=0.01) for n in indices]
    peaks = [flow.max_velocity / flow.mean_velocity for flow in flows]
    assert np.all(np.diff(peaks) < 0)
    assert peaks[-1] > 1


def test_a_thin_fluid_nears_a_plug():
    """In a tube the largest velocity is (3n + 1)/(n + 1) times the mean one."""
    for n in (1.0, 0.5, 0.2, 0.05):
        flow = solve(circle(2.0), PowerLaw(1.0, n), pressure_gradient=2.0, accuracy=0.01)
        peak = flow.max_velocity / flow.mean_velocity
        assert peak == pytest.approx((3 * n + 1) / (n + 1), rel=0.01)
    assert peak < 1.1


@pytest.mark.parametrize("name", SHAPES)
def test_a_thinner_fluid_needs_less_pressure_above_one_per_second(name):
    """At the same flow rate, and with the same apparent viscosity at 1 1/s."""
    section = SECTIONS[name]
    fast = 5.0 * section.area * section.hydraulic_diameter  # 8 U/Dh = 40 1/s
    gradients = [
        solve(section, PowerLaw(2.0, n), flow_rate=fast, accuracy=0.005) for n in (1.0, 0.8, 0.6, 0.4, 0.2)
    ]
    for thicker, thinner in zip(gradients, gradients[1:], strict=False):
        assert thinner.pressure_gradient_bracket[1] < thicker.pressure_gradient_bracket[0]


@pytest.mark.parametrize("name", SHAPES)
def test_a_yield_stress_costs_pressure(name):
    section = SECTIONS[name]
    rate = section.area * section.hydraulic_diameter
    without, little, much = (
        solve(section, Bingham(yield_stress, 1.0), flow_rate=rate, accuracy=0.005)
        for yield_stress in (0.0, 2.0, 6.0)
    )
    assert without.pressure_gradient_bracket[1] < little.pressure_gradient_bracket[0]
    assert little.pressure_gradient_bracket[1] < much.pressure_gradient_bracket[0]
    assert much.max_velocity / much.mean_velocity < without.max_velocity / without.mean_velocity


def test_an_eccentric_pipe_lets_more_through():
    flows = [
        solve(annulus(2.0, 1.0, e), HerschelBulkley(0.1, 1.0, 0.6), pressure_gradient=5.0).flow_rate_bracket
        for e in (0.0, 0.3, 0.6, 0.9)
    ]
    assert all(less[1] < more[0] for less, more in zip(flows, flows[1:], strict=False))


SCALED = {
    "square": (rectangle, (1.0, 1.0)),
    "ellipse": (ellipse, (1.0, 0.4)),
    "annulus": (annulus, (1.0, 0.5)),
}
FLUIDS = {
    "power law": lambda stress, time: PowerLaw(stress * time**0.4, 0.4),
    "Herschel-Bulkley": lambda stress, time: HerschelBulkley(0.05 * stress, stress * time**0.4, 0.4),
    "Carreau": lambda stress, time: CarreauYasuda(stress * time, 0.01 * stress * time, 5 * time, 0.4),
}


@pytest.mark.parametrize("fluid", FLUIDS)
@pytest.mark.parametrize("name", SCALED)
def test_units_of_length_stress_and_time_do_not_matter(name, fluid):
    make, lengths = SCALED[name]
    law = FLUIDS[fluid]
    plain = solve(make(*lengths), law(1.0, 1.0), pressure_gradient=1.0, accuracy=0.01)
    for length, stress, time in ((2.0, 1.0, 1.0), (1.0, 2.0, 1.0), (1.0, 1.0, 2.0), (1e-4, 3e5, 0.01)):
        section = make(*(length * x for x in lengths))
        other = solve(section, law(stress, time), pressure_gradient=stress / length, accuracy=0.01)
        assert other.flow_rate == pytest.approx(plain.flow_rate * length**3 / time, rel=1e-6)
        assert np.array(other.flow_rate_bracket) == pytest.approx(
            np.array(plain.flow_rate_bracket) * length**3 / time, rel=1e-4
        )


def test_doubled_viscosity_halves_a_newtonian_flow():
    one, two = (solve(SECTIONS["L"], Newtonian(mu), pressure_gradient=1.0).flow_rate for mu in (1.0, 2.0))
    assert two == pytest.approx(one / 2, rel=1e-12)


@pytest.mark.parametrize("make", [rectangle, ellipse])
def test_a_section_on_its_side(make):
    upright, lying = (
        solve(make(*sides), Bingham(0.2, 1.0), pressure_gradient=3.0, accuracy=0.003)
        for sides in ((1.0, 0.4), (0.4, 1.0))
    )
    assert overlap(upright.flow_rate_bracket, lying.flow_rate_bracket)
    assert lying.flow_rate == pytest.approx(upright.flow_rate, rel=both(3e-3))


@pytest.mark.parametrize("angle, mirror", [(0.3, 1), (2.0, 1), (0.0, -1), (1.1, -1)])
def test_turned_and_mirrored_outlines(angle, mirror):
    turn = np.array([[math.cos(angle), -math.sin(angle)], [math.sin(angle), math.cos(angle)]])
    moved = np.array(L_CORNERS, dtype=float) @ np.diag([1.0, mirror]) @ turn.T + [3.0, -7.0]
    one, other = (
        solve(polygon(corners), PowerLaw(1.0, 0.4), pressure_gradient=1.0, accuracy=0.003)
        for corners in (L_CORNERS, moved)
    )
    assert overlap(one.flow_rate_bracket, other.flow_rate_bracket)
    assert other.flow_rate == pytest.approx(one.flow_rate, rel=both(3e-3))


@pytest.mark.parametrize("fluid", [PowerLaw(1.0, 0.3), Bingham(0.05, 1.0), Casson(0.05, 1.0)])
def test_a_symmetric_part_stands_for_the_whole(fluid):
    part = solve(rectangle(1.0, 0.6), fluid, pressure_gradient=2.0, accuracy=0.002)
    corners = [(0.0, 0.0), (1.0, 0.0), (1.0, 0.6), (0.0, 0.6)]
    whole = solve(polygon(corners), fluid, pressure_gradient=2.0, accuracy=0.002)
    assert overlap(part.flow_rate_bracket, whole.flow_rate_bracket)
    assert whole.flow_rate == pytest.approx(part.flow_rate, rel=both(2e-3))
    assert part.mesh.points.min(axis=0) == pytest.approx([-0.5, -0.3])
    assert part.max_velocity == pytest.approx(whole.max_velocity, rel=0.02)
