"""The general inverse where its first guess is poor."""

import numpy as np
import pytest

from ductsolve.rheology.inverse import Inverse
from ductsolve.rheology.piecewise import hermite

pytestmark = pytest.mark.filterwarnings("error")


def staircase(x):
    """A rising curve with two steep steps, flat between: ln y = t/50 + tanh(8 (t - 1)) + tanh(8 (t + 1))."""
    t = np.log(x)
    first, second = np.tanh(8.0 * (t - 1.0)), np.tanh(8.0 * (t + 1.0))
    y = np.exp(t / 50.0 + first + second)
    return y, y * (0.02 + 8.0 * (1.0 - first**2) + 8.0 * (1.0 - second**2)), None


class Watched(Inverse):
    bisected = 0

    def _bisect(self, y):
        Watched.bisected += y.size
        return super()._bisect(y)


def test_poor_guesses_are_bisected_to_the_same_accuracy():
    x = np.exp(np.linspace(-4.0, 4.0, 801))
    y, slope, _ = staircase(x)
    found = Watched(staircase, np.exp([-5.0, 0.3, 5.0]))(y)
    assert Watched.bisected > 100
    assert np.all(np.abs(found / x - 1.0) * slope / y < 1e-13)


def test_fine_knots_need_no_bisection():
    Watched.bisected = 0
    x = np.exp(np.linspace(-4.0, 4.0, 801))
    y, slope, _ = staircase(x)
    found = Watched(staircase, np.exp(np.linspace(-5.0, 5.0, 801)))(y)
    assert Watched.bisected == 0
    assert np.all(np.abs(found / x - 1.0) * slope / y < 1e-13)


def test_ends_and_nan():
    inverse = Inverse(staircase, np.exp(np.linspace(-5.0, 5.0, 801)))
    given = np.array([0.0, np.nan, np.inf, 1.0, 1e-3, 1e4, 1e-300, 1e300])
    found = inverse(given)
    assert found[0] == 0.0 and np.isnan(found[1]) and found[2] == np.inf
    assert found[3] == pytest.approx(1.0, rel=1e-12)
    # Beyond the knots it is a power law of exponent 1/50, out of the range of numbers at the last two.
    assert np.log(found[4:6]) == pytest.approx(
        [50.0 * (np.log(1e-3) + 2.0), 50.0 * (np.log(1e4) - 2.0)], abs=0.1
    )
    assert found[6] == 0.0 and found[7] == np.inf


def test_hermite_reproduces_a_cubic_and_is_straight_beyond():
    def cubic(x):
        return 2.0 - x + 0.5 * x**2 + 0.1 * x**3

    def slope(x):
        return -1.0 + x + 0.3 * x**2

    knots = np.array([-1.0, 0.0, 2.5, 3.0])
    curve = hermite(knots, cubic(knots), slope(knots))
    x = np.linspace(-1.0, 3.0, 50)
    np.testing.assert_allclose(curve(x), cubic(x), rtol=1e-13)
    np.testing.assert_allclose(curve.derivative()(x), slope(x), rtol=1e-11, atol=1e-13)
    assert curve(np.array([-3.0, 5.0])) == pytest.approx(
        [cubic(-1.0) - 2.0 * slope(-1.0), cubic(3.0) + 2.0 * slope(3.0)]
    )
