"""The tilted fluid: its curve, its exact conjugacy, and the refusal of curves that do not rise."""

import numpy as np
import pytest
from rheology_cases import CASES, DECADES, name, share_above_yield

from ductsolve.errors import FluidError
from ductsolve.rheology.curve import Tilted
from ductsolve.rheology.laws import (
    Bingham,
    Casson,
    Cross,
    Ellis,
    HerschelBulkley,
    Newtonian,
    PowerLaw,
    Sisko,
)
from ductsolve.rheology.tabulated import FlowCurve

pytestmark = pytest.mark.filterwarnings("error")

TABLE = FlowCurve([0.1, 1.0, 4.0, 11.0, 30.0, 400.0], [0.8, 2.0, 5.0, 7.0, 16.0, 40.0])
FLUIDS = {name(case): case.fluid for case in CASES} | {"FlowCurve": TABLE}
every_fluid = pytest.mark.parametrize("fluid", FLUIDS.values(), ids=FLUIDS.keys())
TILTS = [(0.02, 0.7), (-0.02, 0.7), (0.3, 1.2), (-0.4, 0.4), (0.5, 3.0), (-0.05, 0.1)]


def tilted_versions(fluid):
    for tilt, index in TILTS:
        try:
            yield tilt, index, fluid.tilted(tilt, index)
        except FluidError as error:
            assert "does not rise" in str(error)


def true_tilted_stress(fluid, tilt, index, rate):
    return fluid.stress(rate) * (1.0 + tilt - tilt / index * fluid.local_exponent(rate))


@every_fluid
def test_curve_is_the_definition(fluid):
    versions = list(tilted_versions(fluid))
    assert len(versions) >= 2
    for tilt, index, tilted in versions:
        stress = true_tilted_stress(fluid, tilt, index, DECADES)
        np.testing.assert_allclose(tilted.stress(DECADES), stress, rtol=1e-12)
        assert np.all(np.diff(stress) > 0.0)


@every_fluid
def test_inverse_and_conjugacy(fluid):
    for _, _, tilted in tilted_versions(fluid):
        stress = tilted.stress(DECADES)
        error = np.abs(tilted.rate(stress) / DECADES - 1.0)
        lost_digits = share_above_yield(tilted, stress) * tilted.local_exponent(DECADES)
        assert np.all(error * lost_digits < 2e-14)
        power = stress * DECADES
        both = tilted.potential(DECADES) + tilted.complementary(stress)
        assert np.all(np.abs(both / power - 1.0) < 1e-13)


@every_fluid
def test_potentials_belong_to_the_curve(fluid):
    """dF/d(rate) is the stress and dF*/d(stress) the rate, by central differences."""
    step = 1e-5
    for _, _, tilted in tilted_versions(fluid):
        rate = 1.03 * np.logspace(-3.0, 3.0, 61)  # clear of the kinks of a tilted table
        up, down = rate * (1.0 + step), rate * (1.0 - step)
        slope = (tilted.potential(up) - tilted.potential(down)) / (up - down)
        np.testing.assert_allclose(slope, tilted.stress(rate), rtol=1e-8)
        stress, above, below = tilted.stress(rate), tilted.stress(up), tilted.stress(down)
        gained = tilted.complementary(above) - tilted.complementary(below)
        # The rate stays within a step of its middle value, and F* is rounded as rate * stress is.
        error = np.abs(gained - rate * (above - below))
        assert np.all(error <= 2.0 * step * rate * (above - below) + 1e-14 * rate * stress)
    for tilt, index, tilted in tilted_versions(fluid):
        base = fluid.potential(1e-2) * (1.0 + tilt + tilt / index) - tilt / index * 1e-2 * fluid.stress(1e-2)
        assert tilted.potential(1e-2) == pytest.approx(base, rel=1e-12)


@every_fluid
def test_slopes_yield_stress_and_bound(fluid):
    wide = np.logspace(-30.0, 25.0, 2001)
    for tilt, _, tilted in tilted_versions(fluid):
        assert tilted.yield_stress == pytest.approx((1.0 + tilt) * fluid.yield_stress, rel=1e-15)
        up_to_yield = np.linspace(0.0, tilted.yield_stress, 4)
        assert np.all(tilted.rate(up_to_yield) == 0.0) and np.all(tilted.complementary(up_to_yield) == 0.0)
        assert np.all(tilted.local_exponent(wide) <= tilted.exponent_bound * (1.0 + 1e-12))
        stress = tilted.stress(DECADES)
        clear = share_above_yield(tilted, stress) > 1e-3
        slope = DECADES / (stress * tilted.local_exponent(DECADES))
        np.testing.assert_allclose(tilted.rate_slope(stress[clear]), slope[clear], rtol=1e-8)
        assert np.isnan(tilted.rate(np.nan)) and tilted.rate(np.ones((2, 3))).shape == (2, 3)


@every_fluid
def test_no_tilt_is_the_fluid(fluid):
    same, stress = fluid.tilted(0.0, 0.8), fluid.stress(DECADES)
    np.testing.assert_allclose(same.stress(DECADES), stress, rtol=1e-14)
    np.testing.assert_allclose(same.potential(DECADES), fluid.potential(DECADES), rtol=1e-15)
    np.testing.assert_allclose(
        same.complementary(stress), fluid.complementary(stress), rtol=1e-12, atol=1e-300
    )


@every_fluid
def test_refusal_is_neither_loose_nor_timid(fluid):
    """A refused curve, tilted a tenth more, really falls somewhere; an accepted one never does."""
    rate = np.logspace(-20.0, 20.0, 40001)
    refused = 0
    for index in (0.05, 0.3, 1.0, 3.0):
        for tilt in np.linspace(-0.5, 0.5, 21):
            try:
                fluid.tilted(tilt, index)
            except FluidError:
                refused += 1
                stress = true_tilted_stress(fluid, 1.1 * tilt, index, rate)
                assert np.diff(stress).min() < 0.0
            else:
                stress = true_tilted_stress(fluid, tilt, index, rate)
                assert np.all(np.diff(stress) >= -1e-13 * stress[1:])
    assert refused > 0


def test_power_laws_tilt_into_themselves():
    tilt, index = 0.1, 0.7
    assert Newtonian(2.0).tilted(tilt, index).viscosity == pytest.approx(2.0 * (1.1 - 0.1 / 0.7))
    assert PowerLaw(2.0, 0.4).tilted(tilt, index).consistency == pytest.approx(2.0 * (1.1 - 0.04 / 0.7))
    bingham = Bingham(5.0, 0.2).tilted(tilt, index)
    assert (bingham.yield_stress, bingham.plastic_viscosity) == pytest.approx((5.5, 0.2 * (1.1 - 0.1 / 0.7)))
    herschel = HerschelBulkley(5.0, 2.0, 0.4).tilted(tilt, index)
    expected = (5.5, 2.0 * (1.1 - 0.04 / 0.7), 0.4)
    assert (herschel.yield_stress, herschel.consistency, herschel.index) == pytest.approx(expected)


@pytest.mark.parametrize(
    "fluid", [Sisko(0.0, 2.0, 0.4), Casson(0.0, 3.0), Cross(4.0, 4.0, 1.0, 2.0)], ids=str
)
def test_degenerate_laws_tilt_like_the_power_law_they_are(fluid):
    index = float(fluid.local_exponent(1.0))
    plain = PowerLaw(float(fluid.stress(1.0)), index).tilted(0.2, 0.5)
    tilted = fluid.tilted(0.2, 0.5)
    np.testing.assert_allclose(tilted.stress(DECADES), plain.stress(DECADES), rtol=1e-13)
    np.testing.assert_allclose(tilted.rate(DECADES), plain.rate(DECADES), rtol=1e-12)
    np.testing.assert_allclose(tilted.complementary(DECADES), plain.complementary(DECADES), rtol=1e-12)


def test_a_tilted_fluid_is_not_tilted_again():
    tilted = Ellis(1.0, 2.0, 2.0).tilted(0.1, 0.8)
    assert isinstance(tilted, Tilted)
    with pytest.raises(FluidError, match="not tilted again"):
        tilted.tilted(0.1, 0.8)


def test_inverse_survives_kinks_and_flat_stretches():
    """Tilting makes kinks at every point of a table; guesses next to them must still settle."""
    rng = np.random.default_rng(5)
    rate = np.logspace(-2.0, 3.0, 40)
    table = FlowCurve(rate, np.exp(np.cumsum(rng.uniform(0.02, 0.2, rate.size))))
    tilted = table.tilted(0.01, 1.0)
    near = (rate[:, None] * (1.0 + np.linspace(-1e-6, 1e-6, 41))).ravel()
    stress = tilted.stress(near)
    error = np.abs(tilted.rate(stress) / near - 1.0) * tilted.local_exponent(near)
    assert error.max() < 1e-13
    power = stress * near
    assert np.all(np.abs((tilted.potential(near) + tilted.complementary(stress)) / power - 1.0) < 1e-13)


def test_nearly_falling_curve_is_inverted():
    """At the edge of what is allowed the Cross law is nearly flat for decades."""
    fluid = Cross(1.0, 1e-4, 1.0, 1.0099)
    assert fluid.local_exponent(DECADES).min() < 0.02
    error = np.abs(fluid.rate(fluid.stress(DECADES)) / DECADES - 1.0)
    assert np.all(error * fluid.local_exponent(DECADES) < 1e-14)
