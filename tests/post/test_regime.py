"""Reynolds numbers and the laminar limit."""

from dataclasses import replace

import numpy as np
import pytest
from published_data import row, rows

import ductsolve
from ductsolve.post.factors import ShapeFactors
from ductsolve.post.regime import (
    Outlook,
    TangentLaw,
    generalised_reynolds,
    mishra_tripathi_limit,
    regime,
    ryan_johnson_limit,
    tangent_law,
)

SLOT, PIPE = ShapeFactors(24, 1.5), ShapeFactors(16, 2)
DENSITY = 1200.0


def power_law(consistency, index):
    return TangentLaw(index, consistency, 1.0, 1.0, True)


def flow_of(section, fluid, **duty):
    return ductsolve.solve(section, fluid, accuracy=1e-3, **duty)


@pytest.mark.parametrize("index", [0.2, 0.5, 1.0, 1.7])
def test_pipe_gives_the_number_of_metzner_and_reed(index):
    """Metzner & Reed, AIChE J. 1 (1955) 434."""
    speed, diameter, consistency = 0.7, 0.05, 3.0
    expected = (
        DENSITY
        * speed ** (2 - index)
        * diameter**index
        / (8 ** (index - 1) * consistency * ((3 * index + 1) / (4 * index)) ** index)
    )
    found = generalised_reynolds(power_law(consistency, index), PIPE, DENSITY, speed, diameter)
    assert found == pytest.approx(expected, rel=1e-12)


def test_drilling_annulus_of_a_handbook():
    """Guo & Liu, Applied Drilling Circulation Systems (2011), example 2.3: 250 gpm of a 10.5 ppg fluid of
    20 eq. cP and n = 0.8 past 4.5 in in 8.75 in, 1.81 ft/s. Their number, 6523, is defined by the 0.816
    equivalent diameter; with 16/Re and hole less pipe diameter it is 5349."""
    speed = 250 / (2.448 * (8.75**2 - 4.5**2)) * 0.3048
    diameter, density = 4.25 * 0.0254, 10.5 * 119.826427
    found = generalised_reynolds(power_law(0.020, 0.8), SLOT, density, speed, diameter)
    assert found == pytest.approx(5349, rel=1e-3)  # 2.448 has four digits


@pytest.mark.parametrize(
    "section", [ductsolve.rectangle(0.03, 0.01), ductsolve.annulus(0.08, 0.05, 0.5), ductsolve.circle(0.02)]
)
def test_newtonian_numbers_agree(section):
    found = regime(flow_of(section, ductsolve.Newtonian(0.8), flow_rate=1e-4), DENSITY)
    assert found.generalised == pytest.approx(found.friction, rel=1e-3)
    assert found.law.whole_curve


def test_friction_number_is_sixteen_over_the_fanning_factor():
    flow = flow_of(ductsolve.rectangle(0.03, 0.01), ductsolve.PowerLaw(2.0, 0.5), flow_rate=1e-4)
    fanning = 2 * flow.wall_shear.mean / (DENSITY * flow.mean_velocity**2)
    assert regime(flow, DENSITY).friction == pytest.approx(16 / fanning, rel=1e-9)


@pytest.mark.parametrize("index", [0.5, 0.8])
def test_kozicki_misses_the_square_by_what_is_known(index):
    """Kozicki's friction is too high in a square; the exact one is in the table of power-law rectangles."""
    flow = flow_of(ductsolve.rectangle(0.02, 0.02), ductsolve.PowerLaw(2.0, index), flow_rate=1e-5)
    found = regime(flow, DENSITY)
    kozicki = row("B3_kozicki_constants", shape="rectangle", parameter=1)
    exact = row("B2_powerlaw_rectangle_fRe", aspect=1, n=index)["fRe_K"]
    expected = 2 ** (3 * index + 1) * (kozicki["b"] + kozicki["a"] / index) ** index / exact
    assert found.friction / found.generalised == pytest.approx(expected, rel=2e-3)
    assert expected > 1.01


@pytest.mark.parametrize("line", rows("D1_critical_Re"), ids=lambda line: f"n={line['n']:g}")
def test_limits(line):
    assert mishra_tripathi_limit(line["n"]) == pytest.approx(line["MishraTripathi"], rel=1e-6)
    assert ryan_johnson_limit(line["n"]) == pytest.approx(line["RyanJohnson"], rel=1e-6)


@pytest.mark.parametrize(
    ("reynolds", "outlook"),
    [(500, Outlook.LAMINAR), (2200, Outlook.DOUBTFUL), (9000, Outlook.TURBULENT)],
)
def test_outlook(reynolds, outlook):
    """Of a power law in a pipe: 2100 by common practice, 2337 and 2357 by the other rules at n = 0.6."""
    flow = flow_of(ductsolve.circle(0.05), ductsolve.PowerLaw(0.05, 0.6), flow_rate=1e-3)
    density = 1000.0 * reynolds / regime(flow, 1000.0).generalised
    found = regime(flow, density)
    assert found.generalised == pytest.approx(reynolds, rel=1e-6)
    assert found.outlook is outlook


def test_tangent_law_touches_the_curve():
    fluid = ductsolve.HerschelBulkley(5.0, 0.8, 0.6)
    law = tangent_law(fluid, 20.0)
    assert not law.whole_curve
    rates = law.rate * np.array([0.999, 1, 1.001])
    assert fluid.stress(rates) == pytest.approx(law.consistency * rates**law.index, rel=1e-6)


def test_no_power_law_touches_below_the_yield_stress():
    """A square starts to flow before its mean wall shear stress reaches the yield stress (Mosolov &
    Miasnikov 1965). Solving so near the start takes long: only the gradient is brought there."""
    fluid = ductsolve.Bingham(10.0, 0.1)
    flow = flow_of(ductsolve.rectangle(0.02, 0.02), fluid, pressure_gradient=9000.0)
    near = replace(flow, pressure_gradient=3.9 * fluid.yield_stress / 0.02)
    found = regime(near, DENSITY)
    assert found.generalised is None and found.law is None
    assert found.friction == pytest.approx(8 * DENSITY * flow.mean_velocity**2 / (3.9 * 10 / 4))
    assert found.limits == {"common practice": 2100} and found.outlook is Outlook.LAMINAR
