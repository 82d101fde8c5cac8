"""All the files of a job."""

from __future__ import annotations

from pathlib import Path

from ductsolve.app.files import result_json, wall_shear_csv, write_field
from ductsolve.app.job import Outcome
from ductsolve.app.report import report
from ductsolve.app.summary import Block, Row, display_of

NUMBERS = ("result.json", "wall_shear.csv", "field.vtu", "report.html")
PICTURES = ("section", "velocity", "wall_shear")
KINDS = ("png", "svg")


def file_names(pictures: bool = True) -> list[str]:
    """Names of the files, as they are listed."""
    drawn = [f"{name}.{kind}" for name in PICTURES for kind in KINDS] if pictures else []
    return [*NUMBERS, *drawn]


def files_block(folder: Path, pictures: bool = True) -> Block:
    """What was written where, and which files there are older."""
    written = file_names(pictures)
    older = [name for name in file_names() if name not in written and (folder / name).exists()]
    notes = [", ".join(written)]
    if older:
        notes.append(f"Left there by an earlier run, and not of this answer: {', '.join(older)}")
    return Block("files", (Row("written to", (str(folder),)),), notes=tuple(notes))


def write_files(outcome: Outcome, folder: Path, pictures: bool = True) -> None:
    """Write the files of a job into an existing folder."""
    drawn = draw(outcome) if pictures else {}
    for name, kinds in drawn.items():
        for kind, data in kinds.items():
            (folder / f"{name}.{kind}").write_bytes(data)
    texts = {
        "result.json": result_json(outcome),
        "wall_shear.csv": wall_shear_csv(outcome.flow),
        "report.html": report(outcome, drawn),
    }
    for name, text in texts.items():
        (folder / name).write_bytes(text.encode("utf-8"))
    write_field(outcome.flow, folder / "field.vtu")


def draw(outcome: Outcome) -> dict[str, dict[str, bytes]]:
    """Every picture in every kind."""
    from ductsolve.app import plots  # slow to import, and not needed without pictures

    scene = plots.scene(outcome.flow, display_of(outcome))
    figures = {
        "section": plots.section_picture(scene),
        "velocity": plots.velocity_picture(scene),
        "wall_shear": plots.wall_shear_picture(scene),
    }
    return {name: {kind: plots.as_bytes(figure, kind) for kind in KINDS} for name, figure in figures.items()}
