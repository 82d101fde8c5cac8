"""Yield-stress laws beyond Herschel-Bulkley: Casson and Robertson-Stiff, in closed form."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np

from ductsolve.rheology.curve import Curve, transition_knots
from ductsolve.rheology.fluid import Array
from ductsolve.rheology.law import Law, parameter, usable_index, zero_or_above
from ductsolve.rheology.power import PowerLaw


@dataclass(frozen=True, eq=False)
class Casson(Curve, Law):
    """sqrt(stress) = sqrt(yield_stress) + sqrt(plastic_viscosity rate).

    The closed forms follow from u = sqrt(plastic_viscosity rate) and v = sqrt(yield_stress).
    """

    law_name: ClassVar[str] = "Casson"
    exponent_bound: ClassVar[float] = 1.0

    yield_stress: float = parameter("yield stress", "Pa", zero_or_above)
    plastic_viscosity: float = parameter("plastic viscosity", "Pa.s")

    @cached_property
    def knots(self) -> Array:
        if not self.yield_stress:
            return transition_knots()
        return transition_knots((math.log(self.yield_stress / self.plastic_viscosity), 0.5))

    def terms(self, rate: Array) -> tuple[Array, Array, Array]:
        u, v = np.sqrt(self.plastic_viscosity * rate), np.sqrt(self.yield_stress)
        return u * (u + 2.0 * v), u * (u + v), u * (u + 0.5 * v)

    def rate(self, stress: Array) -> Array:
        return self._root(stress) ** 2 / self.plastic_viscosity

    def potential(self, rate: Array) -> Array:
        rate = np.asarray(rate, dtype=float)
        u, v = np.sqrt(self.plastic_viscosity * rate), np.sqrt(self.yield_stress)
        return rate * (v * v + u * (4.0 / 3.0 * v + 0.5 * u))

    def complementary(self, stress: Array) -> Array:
        return self._complementary(self._root(stress))

    def complementary_at(self, rate: Array) -> Array:
        return self._complementary(np.sqrt(self.plastic_viscosity * rate))

    def _complementary(self, u: Array) -> Array:
        return u**3 * (2.0 / 3.0 * np.sqrt(self.yield_stress) + 0.5 * u) / self.plastic_viscosity

    def _root(self, stress: Array) -> Array:
        """u at this stress; 0 up to the yield stress."""
        return np.sqrt(np.maximum(stress, self.yield_stress)) - np.sqrt(self.yield_stress)


# Below this exp(z) - 1 - z is summed from its series: 16 terms leave less than rounding.
_SERIES_LIMIT, _SERIES_TERMS = 1.0, 16


def _expm2(z: Array) -> Array:
    """exp(z) - 1 - z for z >= 0, without cancellation."""
    small = np.minimum(z, _SERIES_LIMIT)
    series = np.ones_like(small)
    for order in range(_SERIES_TERMS + 2, 2, -1):
        series = 1.0 + series * small / order
    return np.where(z < _SERIES_LIMIT, 0.5 * small * small * series, np.expm1(z) - z)


@dataclass(frozen=True, eq=False)
class RobertsonStiff(Curve, Law):
    """stress = consistency (rate + rate_shift)^index; it yields at consistency rate_shift^index.

    The closed forms follow from rate + rate_shift = rate_shift exp(z); without a shift it is a power law.
    """

    law_name: ClassVar[str] = "Robertson-Stiff"

    consistency: float = parameter("consistency", "Pa.s^n")
    index: float = parameter("flow behaviour index", "-", usable_index)
    rate_shift: float = parameter("shear rate shift", "1/s", zero_or_above)

    @cached_property
    def yield_stress(self) -> float:
        return self.consistency * self.rate_shift**self.index

    @property
    def exponent_bound(self) -> float:
        return self.index

    @cached_property
    def knots(self) -> Array:
        return transition_knots((math.log(self.rate_shift), 1.0)) if self.rate_shift else transition_knots()

    def stress(self, rate: Array) -> Array:
        return self.consistency * (np.asarray(rate, dtype=float) + self.rate_shift) ** self.index

    def terms(self, rate: Array) -> tuple[Array, Array, Array]:
        stress = self.stress(rate)
        if not self.rate_shift:
            return stress, self.index * stress, self.index**2 * stress
        excess = self.yield_stress * np.expm1(self.index * self._log(rate))
        moving = rate / (rate + self.rate_shift)
        gain = self.index * moving * stress
        return excess, gain, gain * (1.0 + (self.index - 1.0) * moving)

    def rate(self, stress: Array) -> Array:
        if not self.rate_shift:
            return self._power_law.rate(stress)
        return self.rate_shift * np.expm1(np.log1p(self.excess(stress) / self.yield_stress) / self.index)

    def potential(self, rate: Array) -> Array:
        if not self.rate_shift:
            return self._power_law.potential(rate)
        grown = np.expm1((self.index + 1.0) * self._log(rate))
        return self.yield_stress * self.rate_shift / (self.index + 1.0) * grown

    def complementary_at(self, rate: Array) -> Array:
        if not self.rate_shift:
            return self._power_law.complementary(self.stress(rate))
        n, z = self.index, self._log(rate)
        grown = n * _expm2((n + 1.0) * z) - (n + 1.0) * _expm2(n * z)
        return self.yield_stress * self.rate_shift / (n + 1.0) * grown

    def _log(self, rate: Array) -> Array:
        return np.log1p(np.asarray(rate, dtype=float) / self.rate_shift)

    @cached_property
    def _power_law(self) -> PowerLaw:
        return PowerLaw(self.consistency, self.index)
