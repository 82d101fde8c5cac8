"""Quantities with units: text to SI numbers, and SI numbers to text."""

from __future__ import annotations

import math
import re
from fractions import Fraction
from typing import NamedTuple

from ductsolve.app.unit_grammar import (
    MAX_LENGTH,
    Measure,
    Refusal,
    combine,
    factors,
    measure,
    pounds_force,
    quoted,
)
from ductsolve.errors import CaseError


class Kind(NamedTuple):
    """What a quantity measures: its SI unit and an example of how to write it."""

    unit: str
    example: str


KINDS = {
    "length": Kind("m", "20 mm"),
    "time": Kind("s", "0.3 s"),
    "velocity": Kind("m/s", "0.5 m/s"),
    "density": Kind("kg/m^3", "1200 kg/m^3"),
    "pressure": Kind("Pa", "3 bar"),
    "stress": Kind("Pa", "12 Pa"),
    "viscosity": Kind("Pa.s", "35 mPa.s"),
    "shear rate": Kind("1/s", "100 1/s"),
    "pressure gradient": Kind("Pa/m", "12 bar/m"),
    "volume flow": Kind("m^3/s", "300 L/min"),
    "mass flow": Kind("kg/s", "120 kg/h"),
}
CONSISTENCY_EXAMPLE = "0.6 Pa.s^n"

MAX_EXPONENT = 99  # of ten, in a number as written
SMALLEST, LARGEST = Fraction(1, 10**30), Fraction(10**30)  # SI; beyond is a slip of the pen, not a duct

_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE](?P<exponent>[+-]?\d+))?", re.ASCII)
_EQUIVALENT_CENTIPOISE = re.compile(r"eq(\.\s*|\s+)cP")


def parse(text: object, kind: str, *, where: str) -> float:
    """Read a quantity such as ``"20 mm"`` and give it in SI units.

    Parameters
    ----------
    text : what stands in the case file; anything but text with a number and a unit is refused
    kind : a key of ``KINDS``
    where : put before the message of an error, such as ``"case.toml: [section] width"``

    Returns
    -------
    value : not negative, in the unit ``KINDS[kind].unit``

    Raises
    ------
    CaseError
        in one line, for whatever is not a finite, non-negative quantity of that kind.
    """
    try:
        number, unit = _split(text, KINDS[kind].example)
        return _bounded(number * _size(unit, kind), text)
    except Refusal as refusal:
        raise CaseError(f"{where}: {refusal}") from None


def parse_consistency(text: object, index: float, *, where: str) -> float:
    """Read a consistency such as ``"0.6 Pa.s^n"`` for the flow behaviour index n, in Pa.s^n.

    The power of the second may be written ``n``, or as a number if it equals the index. An equivalent
    centipoise, ``eq. cP``, is 1 mPa.s^n (common practice in drilling, no source).
    """
    try:
        number, unit = _split(text, CONSISTENCY_EXAMPLE)
        return _bounded(number * _consistency_size(unit, index), text)
    except Refusal as refusal:
        raise CaseError(f"{where}: {refusal}") from None


def scale(unit: str, kind: str, *, where: str = "unit") -> float:
    """SI size of one ``unit``, such as 0.0254 for ``"in"`` of the kind ``"length"``."""
    try:
        return float(_size(unit, kind))
    except Refusal as refusal:
        raise CaseError(f"{where}: {refusal}") from None


def parse_share(value: object, *, where: str) -> float:
    """Read a share between 0 and 1, written ``"1 %"`` or ``0.01``."""
    try:
        if isinstance(value, str):
            number, unit = _split(value, "1 %")
            share = float(number / 100) if unit == "%" else math.nan
        else:
            share = as_float(value) if is_number(value) else math.nan
        if not 0 < share < 1:
            raise Refusal(f'{quoted(value)} is not a share between 0 and 100 %; write e.g. "1 %" or 0.01')
    except Refusal as refusal:
        raise CaseError(f"{where}: {refusal}") from None
    return share


def unit_of(text: object) -> str:
    """Unit part of a quantity: ``"gpm"`` of ``"350 gpm"``; empty if the text is no quantity."""
    try:
        return _split(text, "")[1]
    except Refusal:
        return ""


def measures(unit: str, kind: str) -> bool:
    """Tell whether ``unit`` is one of ``kind``."""
    try:
        return _measure(unit, kind).dimensions == _measure(KINDS[kind].unit, kind).dimensions
    except Refusal:
        return False


# --- showing -----------------------------------------------------------------------------------------

# SI unit -> units to show it in, each with the least SI value it is used for, largest first.
_LADDERS = {
    "m": (("m", 1.0), ("mm", 0.0)),
    "m/s": (("m/s", 0.1), ("mm/s", 0.0)),
    "Pa": (("MPa", 1e6), ("kPa", 1e3), ("Pa", 0.0)),
    "Pa/m": (("MPa/m", 1e6), ("kPa/m", 1e3), ("Pa/m", 0.0)),
    "m^3/s": (("m^3/h", 0.2), ("L/min", 1e-6), ("mL/min", 0.0)),
}


def suiting(value: float, unit: str) -> str:
    """Multiple of an SI unit in which a value of that unit reads best."""
    return next(name for name, least in _LADDERS[unit] if abs(value) >= least)


# --- reading -----------------------------------------------------------------------------------------


def noun(value: object) -> str:
    """What a value of a case file is, in a word or two."""
    words = {bool: str(value is True).lower(), str: "text", list: "a list", dict: "a table", int: "a number"}
    return words.get(type(value), "a number" if isinstance(value, float) else "a date or time")


def is_number(value: object) -> bool:
    """Tell whether a value of a case file is a plain number."""
    return isinstance(value, int | float) and not isinstance(value, bool)


def as_float(number: int | float) -> float:
    """A number of a case file as a float, infinite when a whole number is too long for one."""
    try:
        return float(number)
    except OverflowError:
        return math.inf


def _split(text: object, example: str) -> tuple[Fraction, str]:
    """Number and unit of a quantity, the number exactly as written."""
    hint = f'write e.g. "{example}"'
    if not isinstance(text, str):
        raise Refusal(_not_text(text, hint))
    words = " ".join(text.split())
    if len(words) > MAX_LENGTH:
        raise Refusal(f"{quoted(text)} is too long for a quantity; {hint}")
    if re.match(r"[+-]?[\d.]*,\d", words):
        raise Refusal(
            f'{quoted(text)} has a comma; write a decimal point and no thousands mark, as in "1.5 mm"'
        )
    number = _NUMBER.match(words)
    if number is None:
        raise Refusal(f"{quoted(text)} does not start with a number; {hint}")
    if number.group().startswith("-"):
        raise Refusal(f"{quoted(text)} is negative; it must not be")
    if abs(int(number["exponent"] or 0)) > MAX_EXPONENT:
        raise Refusal(f"{quoted(text)} is out of range; check the number")
    unit = words[number.end() :].strip()
    if not unit:
        raise Refusal(f"{quoted(text)} is missing its unit: {hint}")
    return Fraction(number.group()), unit


def _not_text(value: object, hint: str) -> str:
    """Say what is wrong with a quantity that is not given as text."""
    if not is_number(value):
        return f"found {noun(value)} where a number with a unit belongs; {hint}"
    if not math.isfinite(as_float(value)):
        return f"{as_float(value)} is not a finite number; {hint}"
    return f"{as_float(value):g} is missing its unit: {hint}"


def _bounded(value: Fraction, text: object) -> float:
    """The value as a float, if any duct could have it."""
    if value and not SMALLEST <= value <= LARGEST:
        raise Refusal(f"{quoted(text)} is out of range; check the number")
    return float(value)


def _measure(unit: str, kind: str) -> Measure:
    """Work out a unit; in a stress, lb means a force."""
    return measure(unit, pound_is_force=kind == "stress")


def _size(unit: str, kind: str) -> Fraction:
    """Size of a unit in the SI unit of its kind, once its dimensions are checked."""
    hint = f'a {kind} reads e.g. "{KINDS[kind].example}"'
    try:
        found = _measure(unit, kind)
    except Refusal as refusal:
        raise Refusal(f"{refusal}; {hint}") from None
    if found.dimensions != measure(KINDS[kind].unit).dimensions:
        raise Refusal(f"{quoted(unit)} is not a unit of {kind}{_other_kinds(found)}; {hint}")
    return found.size


def _other_kinds(found: Measure) -> str:
    """Name the kinds a unit does measure, if there are any."""
    kinds = [kind for kind, record in KINDS.items() if measure(record.unit).dimensions == found.dimensions]
    return f" but of {' or '.join(kinds)}" if kinds else ""


def _consistency_size(unit: str, index: float) -> Fraction:
    """Size of a unit of consistency, stress times s^n, in Pa.s^n."""
    unit = _EQUIVALENT_CENTIPOISE.sub("mPa.s^n", unit)
    parts = factors(unit)
    seconds = [part for part in parts if part.name in ("s", "sec")]
    if index == 1 and (len(seconds) != 1 or seconds[0].power < 0):  # cP, kg/m/s
        return _size(unit, "viscosity")
    stress = combine(pounds_force([part for part in parts if part not in seconds]), unit)
    hint = f'write e.g. "{CONSISTENCY_EXAMPLE}"'
    if len(seconds) != 1 or seconds[0].power < 0 or stress.dimensions != measure("Pa").dimensions:
        raise Refusal(f"{quoted(unit)} is not a unit of consistency, stress times s^n; {hint}")
    power = seconds[0].odd or str(seconds[0].power)
    if power != "n" and not math.isclose(float(power), index, rel_tol=1e-9):
        raise Refusal(f"{quoted(unit)} has s to the power {power} but the index is {index:g}; {hint}")
    return stress.size
