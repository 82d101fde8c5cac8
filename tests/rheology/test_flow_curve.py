"""Tabulated flow curves."""

import csv
from pathlib import Path

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from ductsolve.errors import FluidError
from ductsolve.rheology.laws import CarreauYasuda
from ductsolve.rheology.tabulated import FlowCurve

pytestmark = pytest.mark.filterwarnings("error")

PUBLISHED = Path(__file__).parents[1] / "published" / "F1_flow_curves.csv"


def measured():
    """3 % aqueous HPMC, 24.2 C, parallel plates: Steffe, Rheological Methods (1996), table 3.5."""
    lines = [line for line in PUBLISHED.read_text().splitlines() if not line.startswith("#")]
    rows = [row for row in csv.DictReader(lines) if row["dataset"] == "HPMC3"]
    return np.array([[float(row["shear_rate"]), float(row["shear_stress"])] for row in rows]).T


RATE, STRESS = measured()
CURVE = FlowCurve(RATE, STRESS)
WIDE = np.logspace(-8.0, 7.0, 3001)


def test_points_are_met_and_the_curve_rises():
    assert RATE.size == 16
    np.testing.assert_allclose(CURVE.stress(RATE), STRESS, rtol=1e-14)
    np.testing.assert_allclose(CURVE.rate(STRESS), RATE, rtol=1e-14)
    assert np.all(np.diff(CURVE.stress(WIDE)) > 0.0)


def test_inside_it_is_the_monotone_cubic_in_logarithms():
    """SciPy's PCHIP is an independent implementation of the same interpolant away from the ends."""
    inside = np.geomspace(RATE[1], RATE[-2], 500)
    peer = np.exp(PchipInterpolator(np.log(RATE), np.log(STRESS))(np.log(inside)))
    np.testing.assert_allclose(CURVE.stress(inside), peer, rtol=1e-13)


def test_beyond_the_ends_it_is_a_power_law_of_the_slope_there():
    for edge, beyond in ((RATE[0], [1e-4, 1e-8]), (RATE[-1], [1e2, 1e6])):
        exponent = CURVE.local_exponent(edge)
        expected = CURVE.stress(edge) * (np.array(beyond) / edge) ** exponent
        np.testing.assert_allclose(CURVE.stress(beyond), expected, rtol=1e-12)
        np.testing.assert_allclose(CURVE.local_exponent(beyond), exponent, rtol=1e-12)


def test_end_slopes_are_the_parabolas_within_reason():
    """Points of ln(rate) a unit apart with the slopes given between them."""

    def ends(*slopes):
        rate = np.exp(np.arange(len(slopes) + 1.0))
        curve = FlowCurve(rate, np.exp(np.concatenate(([0.0], np.cumsum(slopes)))))
        return curve.local_exponent(rate[0]), curve.local_exponent(rate[-1])

    assert ends(0.6, 0.5, 0.3) == pytest.approx((0.65, 0.2))  # d = 1.5 first - 0.5 second
    assert ends(0.2, 2.0, 0.2) == pytest.approx((0.1, 0.1))  # the parabola would fall: half the last slope
    assert ends(4.0, 0.1, 4.0) == pytest.approx((5.0, 5.0))  # 5.95 is steeper than any piece may be


def test_inverse_and_potentials():
    stress = CURVE.stress(WIDE)
    np.testing.assert_allclose(CURVE.rate(stress), WIDE, rtol=2e-14)
    both = CURVE.potential(WIDE) + CURVE.complementary(stress)
    np.testing.assert_allclose(both, stress * WIDE, rtol=1e-14)


def test_potential_is_the_integral_of_the_stress():
    nodes, weights = np.polynomial.legendre.leggauss(20)
    edges = np.unique(np.concatenate((np.log(RATE), np.linspace(np.log(1e-3), np.log(1e3), 60))))
    half, middle = 0.5 * np.diff(edges), 0.5 * (edges[1:] + edges[:-1])
    rate = np.exp(middle[:, None] + half[:, None] * nodes)
    gained = (CURVE.stress(rate) * rate) @ weights * half
    below = CURVE.stress(1e-3) * 1e-3 / (1.0 + CURVE.local_exponent(1e-3))
    np.testing.assert_allclose(CURVE.potential(np.exp(edges[1:])), below + np.cumsum(gained), rtol=1e-12)


def test_slopes():
    up, down = WIDE * np.exp(1e-5), WIDE * np.exp(-1e-5)
    slope = np.log(CURVE.stress(up) / CURVE.stress(down)) / 2e-5
    np.testing.assert_allclose(CURVE.local_exponent(WIDE), slope, rtol=1e-5)
    stress = CURVE.stress(WIDE)
    np.testing.assert_allclose(
        CURVE.rate_slope(stress), WIDE / stress / CURVE.local_exponent(WIDE), rtol=1e-12
    )


@pytest.mark.parametrize(
    "points",
    [
        (RATE, STRESS),
        ([1.0, 2.0], [3.0, 4.0]),
        ([1.0, 10.0, 20.0, 21.0, 500.0], [1.0, 1.1, 6.0, 6.5, 7.0]),
        ([1.0, 2.0, 40.0], [1.0, 20.0, 21.0]),
    ],
)
def test_exponent_bound_is_the_largest_exponent(points):
    curve = FlowCurve(*points)
    exponents = curve.local_exponent(np.geomspace(min(points[0]) / 10.0, max(points[0]) * 10.0, 20001))
    assert exponents.max() <= curve.exponent_bound * (1.0 + 1e-14)
    assert exponents.max() == pytest.approx(curve.exponent_bound, rel=1e-4)


def test_two_points_are_a_power_law():
    curve = FlowCurve([2.0, 200.0], [3.0, 30.0])
    np.testing.assert_allclose(curve.stress(WIDE), 3.0 * (WIDE / 2.0) ** 0.5, rtol=1e-12)
    np.testing.assert_allclose(curve.potential(WIDE), curve.stress(WIDE) * WIDE / 1.5, rtol=1e-12)


def test_a_finer_table_of_a_smooth_curve_is_closer_at_third_order_or_better():
    law, inside = CarreauYasuda(10.0, 0.1, 1.0, 0.4), np.geomspace(1e-2, 1e2, 777)

    def error(points):
        rate = np.geomspace(1e-3, 1e3, points)
        table = FlowCurve(rate, law.stress(rate))
        return np.abs(table.stress(inside) / law.stress(inside) - 1.0).max()

    coarse, fine = error(13), error(25)
    assert coarse < 0.01
    assert np.log2(coarse / fine) > 2.0  # the monotone slopes are of second order, hence the cubic of third


def test_order_of_the_points_makes_no_difference_and_the_table_is_kept_safe():
    mixed = np.random.default_rng(1).permutation(RATE.size)
    shuffled = FlowCurve(RATE[mixed], STRESS[mixed])
    assert np.array_equal(shuffled.stress(WIDE), CURVE.stress(WIDE))
    own = np.array([1.0, 2.0])
    curve = FlowCurve(own, [1.0, 2.0])
    own[0] = 7.0
    assert curve.shear_rate[0] == 1.0
    with pytest.raises(ValueError, match="read-only"):
        curve.shear_stress[0] = 3.0


def test_rest_shapes_and_nan():
    assert CURVE.stress(0.0) == CURVE.rate(0.0) == CURVE.potential(0.0) == CURVE.complementary(0.0) == 0.0
    values = np.array([[1.0, np.nan], [1e-300, 1e9]])
    for method in (CURVE.stress, CURVE.rate, CURVE.potential, CURVE.complementary, CURVE.rate_slope):
        answer = method(values)
        assert answer.shape == (2, 2) and np.isnan(answer[0, 1]) and np.isfinite(answer.ravel()[[0, 2]]).all()


def test_reach_tells_how_far_beyond_the_table():
    curve = FlowCurve([1.0, 10.0], [1.0, 3.0])
    assert curve.reach([1.0, 5.0, 10.0]) is None
    assert curve.reach([0.0, 5.0]) is None
    assert curve.reach([]) is None
    above = curve.reach([2.0, 40.0])
    assert "up to 40 1/s, 4 times above" in above and "below" not in above
    both = curve.reach([0.05, 40.0])
    assert "down to 0.05 1/s, 20 times below" in both and "4 times above" in both and "1 to 10 1/s" in both


@pytest.mark.parametrize(
    ("rate", "stress", "message"),
    [
        (
            [1, 2, 3],
            [1, 2, 1.5],
            "from 2 to 1.5 Pa as shear_rate rises from 2 to 3 1/s; a flow curve must rise",
        ),
        ([1, 2, 3], [1, 2, 2], "must rise"),
        ([3, 2, 1], [1, 2, 3], "must rise"),
        ([1, 2, 2], [1, 2, 3], "shear_rate 2 1/s is given twice; average"),
        ([1, 100], [1, 1.000001], "an exponent of 2.2e-07"),
        ([1, 1.1], [1, 3], "an exponent of 12"),
        ([1], [1], "found 1 point; give at least two"),
        ([], [], "found 0 point; give at least two"),
        ([0, 1], [1, 2], "shear_rate of point 1 is 0"),
        ([1, 2], [-1, 2], "shear_stress of point 1 is -1"),
        ([1, 2, float("nan")], [1, 2, 3], "shear_rate of point 3 is nan"),
        ([1, 2], [1, float("inf")], "shear_stress of point 2 is inf"),
        ([1, 2], [1, 2, 3], "shear_rate has 2 values, shear_stress 3"),
        (["1", "2"], [1, 2], "shear_rate is not one column of numbers"),
        ([True, False], [1, 2], "shear_rate is not one column of numbers"),
        ([[1, 2]], [1, 2], "shear_rate is not one column of numbers"),
        ([1, [2, 3]], [1, 2], "shear_rate is not one column of numbers"),
        (None, [1, 2], "shear_rate is not one column of numbers"),
        ([1, 2], 5.0, "shear_stress is not one column of numbers"),
    ],
)
def test_bad_tables_are_refused_in_one_line(rate, stress, message):
    with pytest.raises(FluidError) as refusal:
        FlowCurve(rate, stress)
    text = str(refusal.value)
    assert message in text and text.startswith("flow curve: ") and "\n" not in text


def test_description():
    assert CURVE.describe() == (
        ("number of points", 16.0, "-"),
        ("first shear rate", 0.0127, "1/s"),
        ("last shear rate", 12.55, "1/s"),
        ("first shear stress", 0.5, "Pa"),
        ("last shear stress", 146.0, "Pa"),
    )
