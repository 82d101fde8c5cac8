"""Numbers and quantities as text, in SI and as people read them; guaranteed bounds are rounded outward."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Decimal

from ductsolve.app import units
from ductsolve.app.case import ReportUnit

# Quantity of an answer -> its SI unit and its kind in the table of units.
SI = {
    "pressure_gradient": ("Pa/m", "pressure gradient"),
    "pressure_drop": ("Pa", "pressure"),
    "flow_rate": ("m^3/s", "volume flow"),
    "velocity": ("m/s", "velocity"),
    "stress": ("Pa", "stress"),
    "length": ("m", "length"),
}
DOWN, UP, NEAREST = ROUND_FLOOR, ROUND_CEILING, ROUND_HALF_EVEN
USUAL_DIGITS, MOST_DIGITS = 5, 12
PLAIN_FROM, PLAIN_BELOW = -4, 7  # powers of ten written out in full


def figures(
    value: float | Decimal, digits: int = USUAL_DIGITS, rounding: str = NEAREST, padded: bool = False
) -> str:
    """Number to so many significant digits, rounded as told, without a power of ten where it stays short.

    ``padded`` keeps zeros at the end, which then are significant too.
    """
    if not math.isfinite(value):
        return "without bound" if value > 0 else "unknown"
    number = _exactly(value)
    if not number:
        return "0"
    number = number.quantize(Decimal(1).scaleb(number.adjusted() - digits + 1), rounding=rounding)
    power, finish = number.adjusted(), str if padded else _trimmed
    if PLAIN_FROM <= power < PLAIN_BELOW:
        return finish(f"{number:f}")
    return f"{finish(f'{number.scaleb(-power):f}')}e{power}"


def _exactly(value: float | Decimal) -> Decimal:
    """The number as it is written, so that 0.3 is not rounded down to 0.29999."""
    return value if isinstance(value, Decimal) else Decimal(repr(float(value)))


def percent(share: float, digits: int = 2, rounding: str = NEAREST) -> str:
    """Share as a percentage."""
    return f"{figures(100 * share, digits, rounding)} %"


def half_width_text(half_width: float | None) -> str:
    """Relative half-width of a bracket, rounded up."""
    return "without bound" if half_width is None else f"+/- {percent(half_width, 3, UP)}"


def digits_for(half_width: float | None) -> int:
    """Significant digits that tell the two ends of a bracket apart, two of them in its width."""
    if not half_width or half_width >= 1:
        return USUAL_DIGITS
    return min(max(USUAL_DIGITS, 2 + math.ceil(-math.log10(half_width))), MOST_DIGITS)


def _trimmed(text: str) -> str:
    return text.rstrip("0").rstrip(".") if "." in text else text


@dataclass(frozen=True)
class Display:
    """How one case shows its quantities.

    Attributes
    ----------
    report : units asked for by the case
    extent : size of the section [m], from which its lengths take their unit
    """

    report: Sequence[ReportUnit] = ()
    extent: float = 1.0

    def unit(self, quantity: str, typical: float) -> ReportUnit:
        """Unit a quantity is read in: the one asked for, or the multiple that suits a typical value."""
        for asked in self.report:
            if asked.quantity == quantity:
                return asked
        si, kind = SI[quantity]
        if not math.isfinite(typical):
            return ReportUnit(quantity, si, 1.0)
        unit = units.suiting(typical, si)
        return ReportUnit(quantity, unit, 1 / units.scale(unit, kind))

    def both(
        self,
        value: float,
        quantity: str,
        digits: int = USUAL_DIGITS,
        rounding: str = NEAREST,
        typical: float | None = None,
        padded: bool = False,
    ) -> tuple[str, str]:
        """Texts of a value in SI and in the unit that suits it or ``typical``; the second may be empty."""
        if not math.isfinite(value):
            return figures(value), ""
        si = f"{figures(value, digits, rounding, padded)} {SI[quantity][0]}"
        unit = self.unit(quantity, value if typical is None else typical)
        own = f"{figures(_exactly(value) * _exactly(unit.per_si), digits, rounding, padded)} {unit.unit}"
        return si, own if own != si else ""

    def bracket(
        self, low: float, best: float, high: float, quantity: str, digits: int = USUAL_DIGITS
    ) -> list[tuple[str, str]]:
        """Texts of both ends of a bracket, rounded outward, and of what lies between, in one unit."""
        ways = zip((low, best, high), (DOWN, NEAREST, UP), strict=True)
        return [self.both(value, quantity, digits, way, best, padded=True) for value, way in ways]

    def read(self, value: float, quantity: str, digits: int = USUAL_DIGITS) -> str:
        """Text of a value in the unit it is read in."""
        si, own = self.both(value, quantity, digits)
        return own or si

    @property
    def length(self) -> ReportUnit:
        """Unit of positions and dimensions."""
        return self.unit("length", self.extent)

    def place(self, point) -> str:
        """Position as text."""
        length = self.length
        x, y = (figures(_cleaned(c, self.extent) * length.per_si, 4) for c in point)
        return f"({x}, {y}) {length.unit}"


def _cleaned(coordinate, extent):
    """Coordinate with rounding errors about zero taken out."""
    return 0.0 if abs(coordinate) < 1e-9 * extent else float(coordinate)
