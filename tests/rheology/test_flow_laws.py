"""Every law against its plain formula and against quadrature, over twelve decades of shear rate."""

import numpy as np
import pytest
from rheology_cases import CASES, DECADES, name, plain_stress, share_above_yield

from ductsolve.rheology.curve import Curve

pytestmark = pytest.mark.filterwarnings("error")
every_law = pytest.mark.parametrize("case", CASES, ids=name)


NODES, WEIGHTS = np.polynomial.legendre.leggauss(16)


def integral(function, upper, start=0.0):
    """Integral from start to upper of a function that vanishes like a power at start, in ln(x - start).

    Gauss's rule on pieces a quarter of an e-folding wide: exact to rounding for every law here.
    """
    edges = np.log(upper - start) - np.linspace(90.0, 0.0, 361)
    log_x = 0.5 * (edges[1:] + edges[:-1])[:, None] + 0.5 * np.diff(edges)[:, None] * NODES
    x = np.exp(log_x)
    return float(np.sum(function(start + x) * x @ WEIGHTS * 0.5 * np.diff(edges)))


@every_law
def test_curve_is_the_plain_formula(case):
    fluid, stress = case.fluid, case.fluid.stress(DECADES)
    if case.stress:
        np.testing.assert_allclose(stress, case.stress(DECADES), rtol=1e-13)
    else:
        np.testing.assert_allclose(case.rate(stress), DECADES, rtol=1e-12)
        np.testing.assert_allclose(fluid.rate(DECADES), case.rate(DECADES), rtol=1e-13)


@every_law
def test_rate_inverts_the_stress(case):
    stress = plain_stress(case, DECADES)
    error = np.abs(case.fluid.rate(stress) / DECADES - 1.0)
    lost_digits = share_above_yield(case.fluid, stress) * case.fluid.local_exponent(DECADES)
    assert np.all(error * lost_digits < 1e-14)


@every_law
@pytest.mark.parametrize("rate", [1e-6, 1e-3, 0.3, 7.0, 1e3, 1e6])
def test_potentials_are_the_integrals(case, rate):
    fluid, stress = case.fluid, float(plain_stress(case, rate))
    assert fluid.potential(rate) == pytest.approx(integral(lambda g: plain_stress(case, g), rate), rel=1e-10)
    if share_above_yield(fluid, stress) > 1e-5:  # below that the stress itself holds too few digits
        assert fluid.complementary(stress) == pytest.approx(
            integral(fluid.rate, stress, fluid.yield_stress), rel=1e-10
        )


def gained(function, edges):
    """Integral of a function over each step between edges a fraction of an e-folding apart."""
    half, middle = 0.5 * np.diff(edges), 0.5 * (edges[1:] + edges[:-1])
    return function(middle[:, None] + half[:, None] * NODES) @ WEIGHTS * half


@every_law
def test_potential_gains_the_integral_at_every_rate(case):
    edges = np.geomspace(1e-14, 1e10, 400)
    expected = gained(lambda g: plain_stress(case, g), edges)
    np.testing.assert_allclose(np.diff(case.fluid.potential(edges)), expected, rtol=2e-13)


@pytest.mark.parametrize("case", [case for case in CASES if isinstance(case.fluid, Curve)], ids=name)
def test_complementary_at_a_rate_keeps_its_digits_near_yield(case):
    """dF* = rate dstress, and dstress = gain d(ln rate): no yield stress is left to drown it."""
    edges = np.geomspace(1e-14, 1e10, 400)
    expected = gained(lambda g: case.fluid.terms(g)[1], edges)
    np.testing.assert_allclose(np.diff(case.fluid.complementary_at(edges)), expected, rtol=1e-12)


@every_law
def test_local_exponent_is_the_slope_in_logarithms(case):
    up, down = DECADES * np.exp(1e-4), DECADES * np.exp(-1e-4)
    slope = np.log(plain_stress(case, up) / plain_stress(case, down)) / 2e-4
    # Central difference: 1e-8 / 6 of the third derivative, which the steepest transition (9) makes large.
    np.testing.assert_allclose(case.fluid.local_exponent(DECADES), slope, rtol=2e-7, atol=1e-11)


@every_law
def test_rate_slope_is_the_slope_of_the_inverse(case):
    fluid, stress = case.fluid, case.fluid.stress(DECADES)
    clear = share_above_yield(fluid, stress) > 1e-3
    rate, stress = DECADES[clear], stress[clear]
    slope = rate / (stress * fluid.local_exponent(rate))
    np.testing.assert_allclose(fluid.rate_slope(stress), slope, rtol=1e-9)


@every_law
def test_exponent_bound_is_the_largest_exponent(case):
    exponents = case.fluid.local_exponent(np.logspace(-30.0, 25.0, 2001))
    assert np.all(exponents <= case.fluid.exponent_bound * (1.0 + 1e-14))
    assert exponents.max() == pytest.approx(case.fluid.exponent_bound, rel=2e-3)


@every_law
def test_rest_and_yield_stress(case):
    fluid = case.fluid
    assert fluid.stress(0.0) == fluid.yield_stress
    assert fluid.potential(0.0) == 0.0
    up_to_yield = np.linspace(0.0, fluid.yield_stress, 5)
    assert np.all(fluid.rate(up_to_yield) == 0.0)
    assert np.all(fluid.complementary(up_to_yield) == 0.0)
    if fluid.yield_stress:
        assert np.all(fluid.rate_slope(up_to_yield) == 0.0)
        assert fluid.local_exponent(0.0) == pytest.approx(0.0, abs=1e-15)


@every_law
def test_tiny_arguments_give_finite_answers(case):
    tiny = np.array([0.0, 5e-324, 1e-200, 1e-100, 1e-30])
    methods = (case.fluid.stress, case.fluid.rate, case.fluid.potential, case.fluid.complementary)
    for method in methods:
        value = method(tiny)
        assert np.all(np.isfinite(value)) and np.all(np.diff(value) >= 0.0)
    assert np.all(np.isfinite(case.fluid.local_exponent(tiny)))


@every_law
@pytest.mark.parametrize(
    "method", ["stress", "rate", "potential", "complementary", "rate_slope", "local_exponent"]
)
def test_shapes_and_nan(case, method):
    function = getattr(case.fluid, method)
    values = np.array([[1.0, 20.0, 300.0], [0.5, 6.0, np.nan]])
    answer = function(values)
    assert answer.shape == values.shape
    assert np.ndim(function(20.0)) == 0 and function(20.0) == pytest.approx(answer[0, 1], rel=1e-15)
    assert np.all(function([20.0, 300.0]) == answer[0, 1:])
    assert function(np.empty(0)).shape == (0,)
    assert not np.isnan(answer.ravel()[:5]).any()
    constant = method in ("rate_slope", "local_exponent") and np.ptp(answer.ravel()[[1, 2, 4]]) == 0.0
    assert constant or np.isnan(answer[1, 2])


def test_power_index_is_told_for_power_laws_only():
    told = {name(case): case.fluid.power_index for case in CASES if case.fluid.power_index is not None}
    assert told == {
        "Newtonian(0.7)": 1.0,
        "PowerLaw(3, 0.4)": 0.4,
        "PowerLaw(0.2, 1.7)": 1.7,
        "Bingham(0, 0.03)": 1.0,
    }
