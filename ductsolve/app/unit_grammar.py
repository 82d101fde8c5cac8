"""What a unit may look like: text such as ``lbf/100ft2`` taken apart and worked out exactly.

The factors come from pint; the grammar is kept here, because a general parser takes
``lbf/100ft**2`` for lbf ft^2/100 and ``mil`` for an angle without complaint.
"""

from __future__ import annotations

import difflib
import functools
import re
from fractions import Fraction
from typing import NamedTuple

MAX_LENGTH = 60

# Unit as written -> name in pint's tables. Case matters: mPa is a thousandth of a pascal, MPa a million.
# The gallon is the US one and the barrel 42 of them (common practice in drilling, no source).
ATOMS = {
    **{name: name for name in "m mm cm km um kg g mg lb lbf N kN mN P cP s ms min h L mL".split()},
    **{name: name for name in "Pa mPa hPa kPa MPa GPa bar mbar psi".split()},
    **{"µm": "micrometer", "in": "inch", "inch": "inch", "ft": "foot", "thou": "thou", "mil": "thou"},
    **{
        "t": "metric_ton",
        "lbm": "pound",
        "dyn": "dyne",
        "sec": "second",
        "hr": "hour",
        "d": "day",
        "day": "day",
    },
    **{"l": "liter", "ml": "milliliter", "gal": "gallon", "bbl": "oil_barrel"},
}
COMPOUNDS = {"gpm": "gal/min", "ppg": "lb/gal"}

_FACTOR = re.compile(
    r"(?P<count>\d{1,6})?(?P<name>[A-Za-zµ]+)(?:\^?(?P<power>-?\d)|\^(?P<odd>n|\d?\.\d+))?", re.ASCII
)
_PRODUCT = re.compile(r"\s*(?:\.(?!\d)|\*|-(?=[A-Za-z]))\s*|\s+")
_PLAIN = str.maketrans({"²": "2", "³": "3", "¹": "1", "⁻": "-", "ⁿ": "^n", "·": ".", "⋅": ".", "μ": "µ"})


class Refusal(Exception):
    """Why a text is no quantity; whoever knows the place puts it before the message."""


class Factor(NamedTuple):
    """One factor of a unit: ``count * name ** power``; ``odd`` is a power that is no whole number."""

    count: Fraction
    name: str
    power: int
    odd: str | None


class Measure(NamedTuple):
    """A unit worked out: its size in SI units and its dimensions (base dimension, power)."""

    size: Fraction
    dimensions: frozenset


def quoted(value: object) -> str:
    """Whatever was found, short and on one line."""
    text = repr(value)
    return text if len(text) <= MAX_LENGTH else f"{text[:MAX_LENGTH]}..."


@functools.lru_cache(maxsize=256)
def measure(unit: str, *, pound_is_force: bool = False) -> Measure:
    """Work out a unit, such as ``"lbf/100ft2"``."""
    parts = factors(unit)
    return combine(pounds_force(parts) if pound_is_force else parts, unit)


def factors(unit: str) -> list[Factor]:
    """Split a unit into factors; those below a solidus get negative powers."""
    if len(unit) > MAX_LENGTH:
        raise Refusal(f"{quoted(unit)} is too long for a unit")
    text = re.sub(r"\s*(\*\*|\^)\s*", "^", unit.strip().translate(_PLAIN))
    above, *below = re.split(r"\s*/\s*", text)
    parts = [] if above in ("", "1") and below else [_factor(word, unit) for word in _PRODUCT.split(above)]
    if any(part.count != 1 for part in parts):
        raise Refusal(f"cannot read the unit {quoted(unit)}")
    for segment in below:
        parts += [_inverse(_factor(word, unit)) for word in _below(segment, unit)]
    return parts


def _below(segment: str, unit: str) -> list[str]:
    """Words between one solidus and the next; several must be bracketed, for kg/m.s has two readings."""
    bracketed = segment.startswith("(") and segment.endswith(")")
    words = _PRODUCT.split(re.sub(r"^(\d+)\s+", r"\1", segment[1:-1].strip() if bracketed else segment))
    if len(words) > 1 and not bracketed:
        raise Refusal(
            f"{quoted(unit)} has two readings; write / before each unit below the line, as in kg/m/s"
        )
    return words


def _factor(word: str, unit: str) -> Factor:
    """Read one factor such as ``100ft2``, ``s^-1`` or ``s^n``."""
    match = _FACTOR.fullmatch(word)
    if match is None or match["power"] in ("0", "-0") or match["count"] and not int(match["count"]):
        raise Refusal(f"cannot read the unit {quoted(unit)}")
    name = match["name"]
    if name not in ATOMS and name not in COMPOUNDS:
        raise Refusal(f"unknown unit {quoted(name)}{_suggestion(name)}")
    return Factor(Fraction(match["count"] or 1), name, int(match["power"] or 1), match["odd"])


def _inverse(factor: Factor) -> Factor:
    """The same factor below the line: lbf/100ft2 is lbf ft^-2 / 100."""
    return factor._replace(count=1 / factor.count, power=-factor.power)


def _suggestion(name: str) -> str:
    """Known units a mistyped one may stand for."""
    known = [*ATOMS, *COMPOUNDS]
    same = [other for other in known if other.casefold() == name.casefold()]
    if same:
        return f"; capitals matter, did you mean {' or '.join(same)}?"
    close = difflib.get_close_matches(name, known, n=2, cutoff=0.6)
    return f"; did you mean {' or '.join(close)}?" if close else ""


def pounds_force(parts: list[Factor]) -> list[Factor]:
    """Read lb as lbf, as in a stress of lb/100ft2 (common practice in drilling, no source)."""
    return [part._replace(name="lbf") if part.name == "lb" else part for part in parts]


def combine(parts: list[Factor], unit: str) -> Measure:
    """Multiply factors out, exactly."""
    size, powers = Fraction(1), {}
    for part in parts:
        if part.odd:
            raise Refusal(f"{quoted(unit)} has a power that is no whole number")
        atom = _atom(part.name)
        size *= part.count * atom.size**part.power
        for dimension, power in atom.dimensions:
            powers[dimension] = powers.get(dimension, 0) + power * part.power
    return Measure(size, frozenset((name, power) for name, power in powers.items() if power))


@functools.cache
def _atom(name: str) -> Measure:
    """Size and dimensions of one named unit, from pint's tables."""
    if name in COMPOUNDS:
        return measure(COMPOUNDS[name])
    registry = _registry()
    base = registry.Quantity(Fraction(1), registry.parse_units(ATOMS[name])).to_base_units()
    return Measure(Fraction(base.magnitude), frozenset(base.dimensionality.items()))


@functools.cache
def _registry():
    """Pint's unit tables with exact factors, built on first use because importing pint is slow."""
    import pint

    return pint.UnitRegistry(non_int_type=Fraction)
