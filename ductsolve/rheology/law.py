"""What every law shares: parameters that are checked, named in field terms and given units."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import MISSING, field, fields
from numbers import Real
from typing import Any, ClassVar

from ductsolve.errors import FluidError

# Beyond these a power law is a plug or a block, and rate = (stress/consistency)^(1/index) overflows.
LEAST_INDEX, LARGEST_INDEX = 0.01, 5.0

# Exponents of a transition outside these make it wider than all measurable rates, or a kink.
LEAST_TRANSITION, LARGEST_TRANSITION = 0.05, 10.0


def above_zero(value: float) -> bool:
    return value > 0.0


def zero_or_above(value: float) -> bool:
    return value >= 0.0


def usable_index(value: float) -> bool:
    return LEAST_INDEX <= value <= LARGEST_INDEX


def usable_plateau_index(value: float) -> bool:
    return -LARGEST_INDEX <= value <= LARGEST_INDEX


def usable_transition(value: float) -> bool:
    return LEAST_TRANSITION <= value <= LARGEST_TRANSITION


def usable_ellis_exponent(value: float) -> bool:
    return 1.0 <= value <= 1.0 / LEAST_INDEX


_WANTED = {
    above_zero: "above 0",
    zero_or_above: "of 0 or above",
    usable_index: f"from {LEAST_INDEX:g} to {LARGEST_INDEX:g}",
    usable_ellis_exponent: f"from 1 to {1.0 / LEAST_INDEX:g}",
    usable_plateau_index: f"from {-LARGEST_INDEX:g} to {LARGEST_INDEX:g}",
    usable_transition: f"from {LEAST_TRANSITION:g} to {LARGEST_TRANSITION:g}",
}


def parameter(
    label: str, unit: str, accepts: Callable[[float], bool] = above_zero, default: Any = MISSING
) -> Any:
    """Dataclass field of a law: its label in field terms, its SI unit text and the values it may take."""
    return field(default=default, metadata={"label": label, "unit": unit, "accepts": accepts})


class Law:
    """Base of the laws: checks the parameters once, at construction, and describes them."""

    law_name: ClassVar[str]

    def __post_init__(self) -> None:
        for item in fields(self):
            value = self._checked(item.name, getattr(self, item.name), item.metadata)
            object.__setattr__(self, item.name, value)
        self._check_together()

    def _checked(self, name: str, value: Any, metadata: Any) -> float:
        number = _as_float(value)
        if not (math.isfinite(number) and metadata["accepts"](number)):
            wanted, unit = _WANTED[metadata["accepts"]], metadata["unit"]
            raise self._error(f"{name} is {repr(value)[:40]}; give a finite number {wanted} [{unit}]")
        return number

    def _check_together(self) -> None:
        """Raise ``FluidError`` where parameters, each fine alone, make no rising curve together."""

    def _error(self, message: str) -> FluidError:
        return FluidError(f"{self.law_name}: {message}")

    def describe(self) -> tuple[tuple[str, float, str], ...]:
        """(label, value, SI unit text) of every parameter, in the order of the constructor."""
        return tuple((f.metadata["label"], getattr(self, f.name), f.metadata["unit"]) for f in fields(self))


def _as_float(value: Any) -> float:
    """The number as a float; NaN for anything that is none, such as text or True."""
    if isinstance(value, bool) or not isinstance(value, Real):
        return math.nan
    try:
        return float(value)
    except OverflowError:
        return math.inf
