"""Laws with plateaus and no yield stress: Carreau-Yasuda, Cross, Ellis and Sisko."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np

from ductsolve.rheology.curve import Curve, transition_knots
from ductsolve.rheology.energy import EnergyShare
from ductsolve.rheology.fluid import Array
from ductsolve.rheology.inverse import Inverse
from ductsolve.rheology.law import (
    LEAST_INDEX,
    Law,
    parameter,
    usable_ellis_exponent,
    usable_index,
    usable_plateau_index,
    usable_transition,
    zero_or_above,
)

# Beyond this many e-foldings of (time_constant rate)^transition the viscosity is a pure power, to rounding.
_PURE = 37.0

# x stays below exp of this, in the range of numbers.
_LARGEST_LOG = 690.0


class PlateauCurve(Curve, Law):
    """viscosity = infinite + (zero - infinite) (1 + x)^((index - 1)/transition).

    x = (time_constant rate)^transition. This is both Carreau-Yasuda and Cross; a law says what its
    index and transition are.
    """

    yield_stress: ClassVar[float] = 0.0

    zero_shear_viscosity: float
    infinite_shear_viscosity: float
    time_constant: float
    index: float
    transition: float

    def _check_together(self) -> None:
        zero, infinite = self.zero_shear_viscosity, self.infinite_shear_viscosity
        if infinite > zero:
            raise self._error(
                f"infinite_shear_viscosity is {infinite:g} Pa.s, above zero_shear_viscosity {zero:g} Pa.s; "
                "give the larger one as zero_shear_viscosity"
            )

    @property
    def exponent_bound(self) -> float:
        return max(1.0, self.index)

    @cached_property
    def knots(self) -> Array:
        """The viscosity leaves the first plateau at x = 1 and nears the second where the two parts match."""
        first, drop = -math.log(self.time_constant), self._drop
        infinite, thinning = self.infinite_shear_viscosity, 1.0 - self.index
        if not (drop and infinite and thinning):
            return transition_knots((first, self.transition))
        second = first + max(math.log(drop / infinite) / thinning, 0.0)
        knots = transition_knots((first, self.transition), (second, abs(thinning)))
        return knots[np.log(knots) - first < _LARGEST_LOG / self.transition]

    def terms(self, rate: Array) -> tuple[Array, Array, Array]:
        steady = self.infinite_shear_viscosity * rate
        base = 1.0 + (self.time_constant * rate) ** self.transition
        thinning = self._drop * rate * base**self._power
        inverse = 1.0 / base
        exponent = 1.0 + (self.index - 1.0) * (1.0 - inverse)
        change = (self.index - 1.0) * self.transition * inverse * (1.0 - inverse)
        return (
            steady + thinning,
            steady + thinning * exponent,
            steady + thinning * (exponent * exponent + change),
        )

    def potential(self, rate: Array) -> Array:
        rate = np.asarray(rate, dtype=float)
        share, thinning = self._thinning(rate)
        return rate * rate * (0.5 * self.infinite_shear_viscosity + thinning * share)

    def complementary_at(self, rate: Array) -> Array:
        rate = np.asarray(rate, dtype=float)
        share, thinning = self._thinning(rate)
        return rate * rate * (0.5 * self.infinite_shear_viscosity + thinning * (1.0 - share))

    @property
    def _drop(self) -> float:
        return self.zero_shear_viscosity - self.infinite_shear_viscosity

    @property
    def _power(self) -> float:
        return (self.index - 1.0) / self.transition

    def _thinning(self, rate: Array) -> tuple[Array, Array]:
        """Potential's share, and viscosity, of the part of the stress that thins."""
        reduced = self.time_constant * rate
        share = self._share(np.log(np.maximum(reduced, 1e-300)))
        return share, self._drop * (1.0 + reduced**self.transition) ** self._power

    @cached_property
    def _share(self) -> EnergyShare:
        reach = _PURE / self.transition
        steepest = max(self.transition, 1.0 - self.index, 2.0)
        edges = np.linspace(-reach, reach, 2 + int(2.0 * reach * steepest))

        def log_stress(log_rate: Array) -> Array:
            return log_rate + self._power * np.log1p(np.exp(self.transition * log_rate))

        return EnergyShare(log_stress, edges, 1.0, self.index)


@dataclass(frozen=True, eq=False)
class CarreauYasuda(PlateauCurve):
    """viscosity = infinite + (zero - infinite) (1 + x)^((index - 1)/transition).

    x = (time_constant rate)^transition. With a transition of 2 it is Carreau's.
    """

    law_name: ClassVar[str] = "Carreau-Yasuda"

    zero_shear_viscosity: float = parameter("zero-shear viscosity", "Pa.s")
    infinite_shear_viscosity: float = parameter("infinite-shear viscosity", "Pa.s", zero_or_above)
    time_constant: float = parameter("time constant", "s")
    index: float = parameter("flow behaviour index", "-", usable_plateau_index)
    transition: float = parameter("transition exponent", "-", usable_transition, default=2.0)

    def _check_together(self) -> None:
        """An index of 0 or less needs a second plateau near enough to keep the stress rising."""
        super()._check_together()
        if self.index < LEAST_INDEX and self.local_exponent(self.knots).min() < LEAST_INDEX:
            raise self._error(
                f"index is {self.index:g}, which lets the stress level off or fall; give {LEAST_INDEX:g} "
                "or more, or a larger infinite_shear_viscosity"
            )


@dataclass(frozen=True, eq=False)
class Cross(PlateauCurve):
    """viscosity = infinite + (zero - infinite) / (1 + (time_constant rate)^exponent).

    That is Carreau-Yasuda with transition = exponent and index = 1 - exponent.
    """

    law_name: ClassVar[str] = "Cross"

    zero_shear_viscosity: float = parameter("zero-shear viscosity", "Pa.s")
    infinite_shear_viscosity: float = parameter("infinite-shear viscosity", "Pa.s", zero_or_above)
    time_constant: float = parameter("time constant", "s")
    exponent: float = parameter("Cross exponent", "-", usable_transition)

    @property
    def transition(self) -> float:
        return self.exponent

    @property
    def index(self) -> float:
        return 1.0 - self.exponent

    def _check_together(self) -> None:
        """The local exponent is least where the viscosity is the geometric mean of zero and infinite."""
        super()._check_together()
        zero, infinite = math.sqrt(self.zero_shear_viscosity), math.sqrt(self.infinite_shear_viscosity)
        least = 1.0 - self.exponent * (zero - infinite) / (zero + infinite)
        if least < LEAST_INDEX:
            largest = (1.0 - LEAST_INDEX) * (zero + infinite) / (zero - infinite)
            raise self._error(
                f"exponent is {self.exponent:g}, which lets the stress level off or fall; between these "
                f"viscosities give {math.floor(1e3 * largest) / 1e3:g} or less"
            )


@dataclass(frozen=True, eq=False)
class Sisko(Curve, Law):
    """viscosity = infinite_shear_viscosity + consistency rate^(index - 1)."""

    law_name: ClassVar[str] = "Sisko"
    yield_stress: ClassVar[float] = 0.0

    infinite_shear_viscosity: float = parameter("infinite-shear viscosity", "Pa.s", zero_or_above)
    consistency: float = parameter("consistency", "Pa.s^n", zero_or_above)
    index: float = parameter("flow behaviour index", "-", usable_index)

    def _check_together(self) -> None:
        if not (self.infinite_shear_viscosity or self.consistency):
            raise self._error("infinite_shear_viscosity and consistency are both 0; give one above 0")

    @property
    def exponent_bound(self) -> float:
        exponents = [1.0] if self.infinite_shear_viscosity else []
        return max(exponents + ([self.index] if self.consistency else []))

    @cached_property
    def knots(self) -> Array:
        """The two parts of the stress match in the middle of the transition."""
        infinite, thinning = self.infinite_shear_viscosity, 1.0 - self.index
        if not (infinite and self.consistency and thinning):
            return transition_knots()
        return transition_knots((math.log(self.consistency / infinite) / thinning, abs(thinning)))

    def terms(self, rate: Array) -> tuple[Array, Array, Array]:
        n, steady, power = self.index, *self._parts(rate)
        return steady + power, steady + n * power, steady + n * n * power

    def potential(self, rate: Array) -> Array:
        steady, power = self._parts(rate)
        return rate * (0.5 * steady + power / (self.index + 1.0))

    def complementary_at(self, rate: Array) -> Array:
        steady, power = self._parts(rate)
        return rate * (0.5 * steady + self.index / (self.index + 1.0) * power)

    def _parts(self, rate: Array) -> tuple[Array, Array]:
        """The two parts of the stress: viscosity times rate, and the power law."""
        rate = np.asarray(rate, dtype=float)
        return self.infinite_shear_viscosity * rate, self.consistency * rate**self.index


@dataclass(frozen=True, eq=False)
class Ellis(Curve, Law):
    """rate = stress/zero_shear_viscosity (1 + (stress/half_stress)^(exponent - 1)).

    The inverse and F* are closed; the stress is found from the inverse.
    """

    law_name: ClassVar[str] = "Ellis"
    yield_stress: ClassVar[float] = 0.0
    exponent_bound: ClassVar[float] = 1.0

    zero_shear_viscosity: float = parameter("zero-shear viscosity", "Pa.s")
    half_stress: float = parameter("stress at half the zero-shear viscosity", "Pa")
    exponent: float = parameter("Ellis exponent", "-", usable_ellis_exponent)

    @cached_property
    def knots(self) -> Array:
        return self.rate(self._stress_knots)

    def stress(self, rate: Array) -> Array:
        return self._forward(rate)

    def rate(self, stress: Array) -> Array:
        stress = np.asarray(stress, dtype=float)
        return stress / self.zero_shear_viscosity * (1.0 + self._thinning(stress))

    def rate_slope(self, stress: Array) -> Array:
        return (1.0 + self.exponent * self._thinning(stress)) / self.zero_shear_viscosity

    def complementary(self, stress: Array) -> Array:
        stress = np.asarray(stress, dtype=float)
        share = 0.5 + self._thinning(stress) / (self.exponent + 1.0)
        return stress * stress / self.zero_shear_viscosity * share

    def complementary_at(self, rate: Array) -> Array:
        return self.complementary(self.stress(rate))

    def potential(self, rate: Array) -> Array:
        stress = self.stress(rate)
        share = 0.5 + self._thinning(stress) * self.exponent / (self.exponent + 1.0)
        return stress * stress / self.zero_shear_viscosity * share

    def terms(self, rate: Array) -> tuple[Array, Array, Array]:
        """From the terms of the inverse: p = d ln(rate)/d ln(stress), change = dp/d ln(stress)."""
        stress = self.stress(rate)
        thinning = self._thinning(stress)
        share, steeper = thinning / (1.0 + thinning), self.exponent - 1.0
        p, change = 1.0 + steeper * share, steeper**2 * share * (1.0 - share)
        return stress, stress / p, stress / p**2 * (1.0 - change / p)

    def _inverse_terms(self, stress: Array) -> tuple[Array, Array, Array]:
        steady, thinning = stress / self.zero_shear_viscosity, self._thinning(stress)
        a = self.exponent
        return steady * (1.0 + thinning), steady * (1.0 + a * thinning), steady * (1.0 + a * a * thinning)

    def _thinning(self, stress: Array) -> Array:
        return (np.asarray(stress, dtype=float) / self.half_stress) ** (self.exponent - 1.0)

    @property
    def _stress_knots(self) -> Array:
        steeper = self.exponent - 1.0
        return transition_knots((math.log(self.half_stress), steeper)) if steeper else transition_knots()

    @cached_property
    def _forward(self) -> Inverse:
        return Inverse(self._inverse_terms, self._stress_knots)
