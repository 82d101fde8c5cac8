"""What every law without closed forms shares: inverse, slopes and tilting from a few terms of the curve."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ductsolve.errors import FluidError
from ductsolve.rheology.fluid import Array
from ductsolve.rheology.inverse import Inverse

# Stands for "at rest" in ratios of two terms that both vanish there.
LEAST_RATE = 1e-50

# A transition between two power laws is over, to 1e-7, this many e-foldings on either side of its centre.
_REACH = 16.0
_KNOTS = 401

# Ranges found on the samples are widened by this share, far more than a curve strays between samples.
_RANGE_MARGIN = 0.01


def transition_knots(*transitions: tuple[float, float]) -> Array:
    """Rates that resolve transitions between power laws, each (ln of its centre, steepness in ln(rate))."""
    spread = np.linspace(-_REACH, _REACH, _KNOTS)
    logs = [np.clip(centre + spread / steepness, -200.0, 200.0) for centre, steepness in transitions]
    return np.exp(np.unique(np.concatenate(logs))) if logs else np.array([0.1, 1.0, 10.0])


class Curve:
    """Flow curve known by its terms. A law supplies

    1. ``yield_stress`` and ``exponent_bound``;
    2. ``terms(rate)``: stress above the yield stress, and its first two derivatives by ln(rate);
    3. ``potential(rate)`` and ``complementary_at(rate)``, F and F* at the stress of that rate;
    4. ``knots``: (n,) rising rates that resolve the curve, any kink of its terms among them; beyond
       them it is a power law, above the yield stress.

    It may replace whatever it has in closed form.
    """

    yield_stress: float
    exponent_bound: float
    power_index: None = None
    knots: Array

    def terms(self, rate: Array) -> tuple[Array, Array, Array | None]:
        raise NotImplementedError

    def complementary_at(self, rate: Array) -> Array:
        raise NotImplementedError

    def stress(self, rate: Array) -> Array:
        return self.yield_stress + self.terms(np.asarray(rate, dtype=float))[0]

    def rate(self, stress: Array) -> Array:
        return self._inverse(self.excess(stress))

    def complementary(self, stress: Array) -> Array:
        return self.complementary_at(self.rate(stress))

    def rate_slope(self, stress: Array) -> Array:
        rate = np.maximum(self.rate(stress), LEAST_RATE)
        slope = rate / self.terms(rate)[1]
        return np.where(np.less_equal(stress, self.yield_stress), 0.0, slope) if self.yield_stress else slope

    def local_exponent(self, rate: Array) -> Array:
        excess, gain, _ = self.terms(np.maximum(rate, LEAST_RATE))
        return gain / (self.yield_stress + excess)

    def tilted(self, tilt: float, index: float) -> Tilted:
        least, largest = self._bend_range
        if 1.0 + tilt <= max(tilt * least, tilt * largest) / index or 1.0 + tilt < 0.0:
            raise FluidError(
                f"tilted by {tilt:g} at index {index:g} the flow curve does not rise; tilt it less"
            )
        return Tilted(self, tilt, index)

    def excess(self, stress: Array) -> Array:
        """Stress above the yield stress [Pa]; 0 up to it."""
        stress = np.asarray(stress, dtype=float)
        return np.maximum(stress - self.yield_stress, 0.0) if self.yield_stress else stress

    @property
    def samples(self) -> Array:
        """(n,) rates on which ranges are taken: the knots, and both sides of any kink."""
        return self.knots

    @cached_property
    def _inverse(self) -> Inverse:
        return Inverse(self.terms, self.knots)

    @cached_property
    def _bend_range(self) -> tuple[float, float]:
        """Least and largest d ln(dstress/d ln(rate)) / d ln(rate): what a tilt adds is limited by it."""
        with np.errstate(over="ignore"):
            _, gain, bend = self.terms(self.samples)
        return widened(bend / gain)


def widened(values: Array) -> tuple[float, float]:
    low, high = float(values.min()), float(values.max())
    margin = _RANGE_MARGIN * (high - low)
    return low - margin, high + margin


@dataclass(frozen=True, eq=False)
class Tilted(Curve):
    """Fluid of the curve stress + tilt (stress - rate stress'/index) of a law.

    Its terms are (1 + tilt) times the law's less tilt/index times their derivatives by ln(rate).
    """

    law: Curve
    tilt: float
    index: float

    @property
    def yield_stress(self) -> float:
        return (1.0 + self.tilt) * self.law.yield_stress

    @property
    def knots(self) -> Array:
        return self.law.knots

    @cached_property
    def exponent_bound(self) -> float:
        with np.errstate(over="ignore"):
            return widened(self.local_exponent(self.law.samples))[1]

    def terms(self, rate: Array) -> tuple[Array, Array, None]:
        excess, gain, bend = self.law.terms(rate)
        keep, share = 1.0 + self.tilt, self.tilt / self.index
        return keep * excess - share * gain, keep * gain - share * bend, None

    def potential(self, rate: Array) -> Array:
        rate = np.asarray(rate, dtype=float)
        keep, share = 1.0 + self.tilt, self.tilt / self.index
        return (keep + share) * self.law.potential(rate) - share * rate * self.law.stress(rate)

    def complementary_at(self, rate: Array) -> Array:
        """(1 + tilt) F* + tilt/index (F* - rate dstress/d ln(rate)): no difference of large numbers."""
        rate = np.asarray(rate, dtype=float)
        keep, share = 1.0 + self.tilt, self.tilt / self.index
        complementary = self.law.complementary_at(rate)
        return keep * complementary + share * (complementary - rate * self.law.terms(rate)[1])

    def tilted(self, tilt: float, index: float) -> Tilted:
        raise FluidError("a tilted flow curve is not tilted again; tilt the law it came from")
