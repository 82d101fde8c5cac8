"""Plain text for the terminal: what a job came to, and how far it has got."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, TextIO

from ductsolve import __version__
from ductsolve.app.display import half_width_text, percent
from ductsolve.app.summary import Block, Row, summary

if TYPE_CHECKING:
    from ductsolve.app.job import Outcome
    from ductsolve.solver.flow import LevelRecord

WIDTH = 96
WIDEST_LABEL, WIDEST_CELL = 46, 44
GAP = "   "


def report_of(outcome: Outcome, files: Block | None = None) -> str:
    """Everything there is to say about a job, and which files it left."""
    blocks = [*summary(outcome), files] if files else summary(outcome)
    case = outcome.case
    return text_of(case.title, f"ductsolve {__version__}, case file {case.path}", blocks)


def text_of(title: str, subtitle: str, blocks: Sequence[Block]) -> str:
    """Blocks as aligned text without colour or boxes."""
    label, cell = _widths([row for block in blocks for row in block.rows])
    parts = [f"{title}\n{subtitle}", *(_block(block, label, cell) for block in blocks)]
    return "\n\n".join(parts)


def _widths(rows: Sequence[Row]) -> tuple[int, int]:
    """Width of the labels, and of cells that have another beside them."""
    label = max(len(row.label) for row in rows)
    cell = max((len(row.cells[0]) for row in rows if len(row.cells) > 1 and row.cells[1]), default=0)
    return min(label, WIDEST_LABEL), min(cell, WIDEST_CELL)


def _block(block: Block, label: int, cell: int) -> str:
    head = Row(block.title[0].upper() + block.title[1:], block.header)
    lines = [_line(head, label + 2, cell), *(_line(row, label, cell, "  ") for row in block.rows)]
    for note in block.notes:
        lines += [f"  {line}" for line in textwrap.wrap(note, WIDTH - 2, break_on_hyphens=False)]
    return "\n".join(lines)


def _line(row: Row, label: int, cell: int, indent: str = "") -> str:
    """One row; a lone cell that is long runs on below itself."""
    start = f"{indent}{row.label:<{label}}{GAP}"
    first, *rest = row.cells or ("",)
    if not any(rest):
        lines = textwrap.wrap(first, max(WIDTH - len(start), cell), break_on_hyphens=False)
        return (start + f"\n{' ' * len(start)}".join(lines)).rstrip()
    return f"{start}{first:<{cell}}{GAP}{GAP.join(rest)}".rstrip()


@contextmanager
def progress_on(stream: TextIO) -> Iterator[Progress | None]:
    """Progress on a terminal, erased in the end; None where the stream is not one."""
    if stream is None or not stream.isatty():
        yield None
        return
    progress = Progress(stream)
    try:
        yield progress
    finally:
        progress.clear()


class Progress:
    """One line that is rewritten while the bracket closes in."""

    def __init__(self, stream: TextIO):
        self.stream, self.levels, self.drawn = stream, 0, 0

    def __call__(self, record: LevelRecord, accuracy: float) -> None:
        """Show the record of one level."""
        self.levels += 1
        if record.half_width is None:
            state = f"gap {percent(record.gap)}, bracket to come"
        else:
            asked = percent(accuracy, 4)
            state = f"{half_width_text(record.half_width)} guaranteed, +/- {asked} asked"
        self._draw(f"level {self.levels}, {record.triangles} triangles: {state}")

    def clear(self) -> None:
        """Leave an empty line behind."""
        self._draw("")
        if self.drawn:
            self.stream.write("\r")
            self.stream.flush()

    def _draw(self, line: str) -> None:
        self.stream.write(f"\r{line:<{self.drawn}}")
        self.stream.flush()
        self.drawn = max(self.drawn, len(line))
