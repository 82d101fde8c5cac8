"""A flow curve given point by point, in the case file or in a CSV file beside it."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

from ductsolve.app import units
from ductsolve.app.schema import Table, blamed_on, read_text
from ductsolve.errors import CaseError

COLUMNS = {"shear_rate": "shear rate", "shear_stress": "stress"}
HEADER_EXAMPLE = '"shear_rate [1/s], shear_stress [Pa]"'


def read_flow_curve(table: Table, folder: Path) -> Any:
    """Fluid through the points that ``[fluid]`` lists or whose ``file`` it names."""
    from ductsolve.rheology.tabulated import FlowCurve

    if "file" in table:
        table.check_keys(["law", "file"], ["density"], "a flow curve from a file")
        name = table.text("file")
        table.note("file", name)
        columns = _read_csv(folder / name)
    else:
        table.check_keys(["law", *COLUMNS], ["density", "file"], "a flow curve")
        columns = {key: _listed_column(table, key, kind) for key, kind in COLUMNS.items()}
    with blamed_on(table.place):
        return FlowCurve(columns["shear_rate"], columns["shear_stress"])


def _listed_column(table: Table, key: str, kind: str) -> list[float]:
    """SI values of ``key = {unit = "...", values = [...]}``."""
    given = table.values[key]
    example = f'{key} = {{unit = "{units.KINDS[kind].unit}", values = [1, 10, 100]}}'
    if not isinstance(given, dict) or not isinstance(given.get("values"), list):
        raise table.error(f"lists numbers and their unit; write e.g. {example}", key)
    column = Table(table.where(key), "", given)
    column.check_keys(["unit", "values"], [], "a column")
    unit, values = column.text("unit"), given["values"]
    size = units.scale(unit, kind, where=column.where("unit"))
    for position, value in enumerate(values, 1):
        if not units.is_number(value) or not 0 <= units.as_float(value) <= units.LARGEST:
            raise table.error(f"value {position} is {units.quoted(value)}, not a number of 0 or above", key)
    table.note(key, f"{len(values)} values in {unit}")
    return [value * size for value in values]


def _read_csv(path: Path) -> dict[str, list[float]]:
    """SI columns of a CSV file whose header names them with their units."""
    text = read_text(path, "flow curve file")
    lines = [line.split(",") for line in text.splitlines() if line.strip()]
    if not lines:
        raise CaseError(f"{path}: the file is empty; it should start with {HEADER_EXAMPLE}")
    sizes = _header(path, lines[0])
    columns: dict[str, list[float]] = {key: [] for key in sizes}
    for number, row in enumerate(lines[1:], 1):
        if len(row) != len(sizes):
            raise CaseError(f"{path}: point {number} has {len(row)} values, not {len(sizes)}")
        for (key, size), word in zip(sizes.items(), row, strict=True):
            columns[key].append(size * _csv_number(path, number, word))
    return columns


def _header(path: Path, words: list[str]) -> dict[str, float]:
    """Columns in the order of the file, each with the SI size of its unit."""
    sizes = {}
    for word in words:
        match = re.fullmatch(r"\s*(\w+)\s*\[([^\[\]]+)\]\s*", word)
        if match and match[1] in COLUMNS:
            sizes[match[1]] = units.scale(match[2], COLUMNS[match[1]], where=f"{path}: {match[1]}")
    if len(sizes) != len(COLUMNS) or len(words) != len(COLUMNS):
        raise CaseError(f"{path}: the first line should name two columns and their units: {HEADER_EXAMPLE}")
    return sizes


def _csv_number(path: Path, number: int, word: str) -> float:
    """One number of a point; the decimal sign is a point."""
    if (
        not re.fullmatch(r"\s*\d*\.?\d+([eE][+-]?\d{1,2})?\s*", word, re.ASCII)
        or len(word) > units.MAX_LENGTH
    ):
        raise CaseError(f"{path}: point {number}: {units.quoted(word)} is not a number of 0 or above")
    return float(word)
