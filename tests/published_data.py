"""Rows of the tables in ``published``; each file names its sources at its top."""

from __future__ import annotations

import csv
from pathlib import Path

FOLDER = Path(__file__).parent / "published"


def rows(name: str) -> list[dict[str, float | str]]:
    """Rows of ``published/<name>.csv`` by column, numbers as floats."""
    lines = (FOLDER / f"{name}.csv").read_text(encoding="utf-8").splitlines()
    table = csv.DictReader(line for line in lines if not line.startswith("#"))
    return [{key: _number(value) for key, value in row.items()} for row in table]


def row(name: str, **wanted: float | str) -> dict[str, float | str]:
    """The one row whose columns hold the values wanted."""
    (found,) = (r for r in rows(name) if all(r[key] == value for key, value in wanted.items()))
    return found


def _number(text: str) -> float | str:
    try:
        return float(text)
    except ValueError:
        return text
