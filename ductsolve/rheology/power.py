"""Laws of the form stress = yield stress + consistency rate^index, all in closed form."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Self

import numpy as np

from ductsolve.rheology.fluid import Array
from ductsolve.rheology.law import Law, parameter, usable_index, zero_or_above


class PowerCurve(Law):
    """Closed forms of the curve; a law names its parameters and says what the others are."""

    yield_stress: float
    consistency: float
    index: float

    def _like(self, yield_stress: float, consistency: float) -> Self:
        """Law of the same kind and index with this yield stress and consistency."""
        raise NotImplementedError

    @property
    def exponent_bound(self) -> float:
        return self.index

    @property
    def power_index(self) -> float | None:
        return None if self.yield_stress else self.index

    def stress(self, rate: Array) -> Array:
        viscous = self.consistency * np.asarray(rate, dtype=float) ** self.index
        return self.yield_stress + viscous if self.yield_stress else viscous

    def rate(self, stress: Array) -> Array:
        return (self._excess(stress) / self.consistency) ** (1.0 / self.index)

    def potential(self, rate: Array) -> Array:
        rate = np.asarray(rate, dtype=float)
        return rate * (self.yield_stress + (self.consistency / (self.index + 1.0)) * rate**self.index)

    def complementary(self, stress: Array) -> Array:
        excess = self._excess(stress)
        share = self.index / (self.index + 1.0)
        return share * excess * (excess / self.consistency) ** (1.0 / self.index)

    def rate_slope(self, stress: Array) -> Array:
        relative = self._excess(stress) / self.consistency
        with np.errstate(divide="ignore"):  # a thickening curve starts with an infinite slope
            slope = relative ** (1.0 / self.index - 1.0) / (self.index * self.consistency)
        return np.where(relative <= 0.0, 0.0, slope) if self.yield_stress else slope

    def local_exponent(self, rate: Array) -> Array:
        rate = np.asarray(rate, dtype=float)
        if not self.yield_stress:
            return np.full_like(rate, self.index)
        viscous = self.consistency * rate**self.index
        return self.index * viscous / (self.yield_stress + viscous)

    def tilted(self, tilt: float, index: float) -> Self:
        on_yield, on_consistency = 1.0 + tilt, 1.0 + tilt - tilt * self.index / index
        if on_consistency <= 0.0 or (self.yield_stress > 0.0 and on_yield < 0.0):
            raise self._error(f"tilted by {tilt:g} at index {index:g} the curve does not rise; tilt it less")
        return self._like(self.yield_stress * on_yield, self.consistency * on_consistency)

    def _excess(self, stress: Array) -> Array:
        """Stress above the yield stress [Pa]; 0 up to it."""
        stress = np.asarray(stress, dtype=float)
        return np.maximum(stress - self.yield_stress, 0.0) if self.yield_stress else stress


@dataclass(frozen=True, eq=False)
class Newtonian(PowerCurve):
    """stress = viscosity rate."""

    law_name: ClassVar[str] = "Newtonian"
    yield_stress: ClassVar[float] = 0.0
    index: ClassVar[float] = 1.0

    viscosity: float = parameter("viscosity", "Pa.s")

    @property
    def consistency(self) -> float:
        return self.viscosity

    def _like(self, yield_stress: float, consistency: float) -> Newtonian:
        return Newtonian(consistency)


@dataclass(frozen=True, eq=False)
class PowerLaw(PowerCurve):
    """stress = consistency rate^index (Ostwald-de Waele)."""

    law_name: ClassVar[str] = "power law"
    yield_stress: ClassVar[float] = 0.0

    consistency: float = parameter("consistency", "Pa.s^n")
    index: float = parameter("flow behaviour index", "-", usable_index)

    def _like(self, yield_stress: float, consistency: float) -> PowerLaw:
        return PowerLaw(consistency, self.index)


@dataclass(frozen=True, eq=False)
class Bingham(PowerCurve):
    """stress = yield_stress + plastic_viscosity rate."""

    law_name: ClassVar[str] = "Bingham"
    index: ClassVar[float] = 1.0

    yield_stress: float = parameter("yield stress", "Pa", zero_or_above)
    plastic_viscosity: float = parameter("plastic viscosity", "Pa.s")

    @property
    def consistency(self) -> float:
        return self.plastic_viscosity

    def _like(self, yield_stress: float, consistency: float) -> Bingham:
        return Bingham(yield_stress, consistency)


@dataclass(frozen=True, eq=False)
class HerschelBulkley(PowerCurve):
    """stress = yield_stress + consistency rate^index."""

    law_name: ClassVar[str] = "Herschel-Bulkley"

    yield_stress: float = parameter("yield stress", "Pa", zero_or_above)
    consistency: float = parameter("consistency", "Pa.s^n")
    index: float = parameter("flow behaviour index", "-", usable_index)

    def _like(self, yield_stress: float, consistency: float) -> HerschelBulkley:
        return HerschelBulkley(yield_stress, consistency, self.index)
