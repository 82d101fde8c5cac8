"""Case files as checked tables: what is asked for is handed out, everything else refused in one line."""

from __future__ import annotations

import difflib
import math
import re
import tomllib
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, NamedTuple

from ductsolve.app import units
from ductsolve.errors import CaseError, DuctsolveError

LARGEST_FILE = 2_000_000  # bytes; a case is a page or two of text


class Input(NamedTuple):
    """One input of a case: what it is, the text given, its SI value (None for words) and SI unit."""

    label: str
    text: str
    value: float | None = None
    unit: str = ""


@dataclass(frozen=True, eq=False)
class Table:
    """One table of a case file.

    Attributes
    ----------
    place : put before every message, such as ``"case.toml: [section]"``
    name : the table's name, which starts the label of every input
    values : the table as read
    inputs : every input handed out so far, shared by the tables of a case
    """

    place: str
    name: str
    values: dict[str, Any]
    inputs: list[Input] = field(default_factory=list)

    def __contains__(self, key: str) -> bool:
        return key in self.values

    def error(self, message: str, key: str = "") -> CaseError:
        """Error that names the file, the table and the key."""
        return CaseError(f"{self.where(key)}: {message}")

    def where(self, key: str) -> str:
        """The place of a key, for an error."""
        return f"{self.place} {key}".rstrip(" :")

    def check_keys(self, required: Iterable[str], optional: Iterable[str], owner: str) -> None:
        """Refuse unknown keys, then missing ones; ``owner`` is what needs them, such as ``"a circle"``."""
        required, optional = list(required), list(optional)
        for key in self.values:
            if key not in required + optional:
                raise self.error(
                    f"unknown key{did_you_mean(key, required + optional)}", units.quoted(key)[1:-1]
                )
        missing = [key for key in required if key not in self.values]
        if missing:
            raise self.error(f"missing {listed(missing)}; {owner} needs {listed(required)}")

    def quantity(self, key: str, kind: str, *, zero: bool = False) -> float:
        """Quantity with a unit, in SI; above zero unless ``zero`` is allowed."""
        value = units.parse(self.values[key], kind, where=self.where(key))
        if value == 0 and not zero:
            raise self.error(f"{units.quoted(self.values[key])} must be above zero", key)
        self.note(key, self.values[key], value, units.KINDS[kind].unit)
        return value

    def consistency(self, key: str, index: float) -> float:
        """Consistency for a flow behaviour index, in Pa.s^index."""
        value = units.parse_consistency(self.values[key], index, where=self.where(key))
        self.note(key, self.values[key], value, f"Pa.s^{index:g}" if index != 1 else "Pa.s")
        return value

    def number(self, key: str) -> float:
        """Finite number without a unit."""
        value = self.values[key]
        if not units.is_number(value) or not math.isfinite(units.as_float(value)):
            found = units.as_float(value) if units.is_number(value) else units.noun(value)
            raise self.error(f"found {found} where a plain number belongs; write e.g. {key} = 0.5", key)
        self.note(key, f"{value:g}", float(value), "")
        return float(value)

    def text(self, key: str) -> str:
        """Text on one line, without control characters."""
        value = self.values[key]
        if not isinstance(value, str) or not value.strip():
            found = "nothing" if isinstance(value, str) else units.noun(value)
            raise self.error(f'found {found} where text belongs; write {key} = "..."', key)
        if not value.isprintable():
            raise self.error(f"{units.quoted(value)} holds characters that cannot be printed", key)
        return value.strip()

    def choice(self, key: str, names: Iterable[str]) -> str:
        """One of ``names``; capitals, spaces, hyphens and underscores make no difference."""
        given, names = self.text(key), list(names)
        for name in names:
            if plain(name) == plain(given):
                self.note(key, name)
                return name
        hint = did_you_mean(given, names)
        raise self.error(f"unknown {key} {units.quoted(given)}{hint}", key)

    def note(self, key: str, text: str, value: float | None = None, unit: str = "") -> None:
        """Keep an input for the echo in the report."""
        label = f"{self.name} {key}".replace("_", " ").strip()
        self.inputs.append(Input(label, " ".join(text.split()), value, unit))


@contextmanager
def blamed_on(where: str) -> Iterator[None]:
    """Put the place in the case file before an error of the library."""
    try:
        yield
    except CaseError:
        raise
    except DuctsolveError as error:
        raise CaseError(f"{where}: {error}") from error


def plain(name: str) -> str:
    """Name without what makes no difference: capitals, spaces, hyphens, underscores."""
    return re.sub(r"[\s_-]+", "", name).casefold()


def did_you_mean(word: str, names: list[str]) -> str:
    """End of an error about an unknown name: the nearest known one, and all of them."""
    by_plain = {plain(name): name for name in names}
    close = difflib.get_close_matches(plain(word)[: units.MAX_LENGTH], by_plain, n=1, cutoff=0.6)
    nearest = f'did you mean "{by_plain[close[0]]}"? ' if close else ""
    return f"; {nearest}known here: {', '.join(names)}"


def listed(names: list[str]) -> str:
    """Names as in a sentence: ``a, b and c``."""
    return " and ".join([", ".join(names[:-1]), names[-1]] if len(names) > 1 else names)


def read_toml(path: Path) -> dict[str, Any]:
    """Content of a TOML file; what cannot be read is refused in one line that names the file."""
    text = read_text(path, "case file")
    if not text.strip():
        raise CaseError(f"{path}: the file is empty; a case needs [section], [fluid] and [duty]")
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise CaseError(f"{path}: brackets are nested too deeply for a case file") from None
    except ValueError as error:
        raise CaseError(f"{path}: {_toml_message(str(error), text)}") from None


def read_text(path: Path, what: str) -> str:
    """Text of a file of a sane size; ``what`` is what it should be, such as ``"case file"``."""
    data = _read_bytes(path, what)
    if len(data) > LARGEST_FILE:
        raise CaseError(f"{path}: is larger than {LARGEST_FILE // 1_000_000} MB, too large for a {what}")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = "\0"
    if "\0" in text:
        raise CaseError(f"{path}: is not a text file (UTF-8); give a {what}")
    return text


def _read_bytes(path: Path, what: str) -> bytes:
    """Start of a file, as far as it may be read at all."""
    try:
        folder, ordinary = path.is_dir(), path.is_file() or not path.exists()
        if ordinary and not folder:
            with path.open("rb") as stream:
                return stream.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise CaseError(f"{path}: no such {what}; check the name and the folder") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise CaseError(f"{units.quoted(str(path))}: cannot read this {what} ({reason})") from None
    raise CaseError(f"{path}: is {'a folder' if folder else 'not an ordinary file'}; give a {what}")


def _toml_message(message: str, text: str) -> str:
    """What is wrong with the TOML, on which line, and the line itself."""
    place = re.search(r"\(at line (\d+), column \d+\)", message)
    if place is None:
        return f"not valid TOML: {message}"
    number = int(place[1])
    line = text.splitlines()[number - 1].strip() if number <= len(text.splitlines()) else ""
    hint = '; text and quantities stand in quotes, as in width = "20 mm"'
    return f"line {number}: not valid TOML: {message[: place.start()].strip()}: {units.quoted(line)}{hint}"
