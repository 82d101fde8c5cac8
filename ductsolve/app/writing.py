"""All the files of a job."""

from __future__ import annotations

from pathlib import Path

from ductsolve.app.files import result_json, wall_shear_csv, write_field
from ductsolve.app.job import Outcome

NUMBERS = ("result.json", "wall_shear.csv", "field.vtu", "report.html")
PICTURES = ("section", "velocity", "wall_shear")
FORMATS = ("png", "svg")


def file_names(pictures: bool = True) -> list[str]:
    """Names of the files, as they are listed."""
    drawn = [f"{name}.{ending}" for name in PICTURES for ending in FORMATS] if pictures else []
    return [*NUMBERS, *drawn]


def write_files(outcome: Outcome, folder: Path, pictures: bool = True) -> None:
    """Write the files of a job into an existing folder."""
    (folder / "result.json").write_text(result_json(outcome), encoding="utf-8")
    (folder / "wall_shear.csv").write_text(wall_shear_csv(outcome.flow), encoding="utf-8")
    write_field(outcome.flow, folder / "field.vtu")
