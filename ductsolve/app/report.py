"""The report: one HTML file with everything, to be read on a screen, on a phone or on paper."""

from __future__ import annotations

import html
from collections.abc import Mapping

from ductsolve import __version__
from ductsolve.app.job import Outcome
from ductsolve.app.markup import block_html, picture_html
from ductsolve.app.summary import display_of, flow_curve_block, history_block, summary

LARGEST_DRAWING = 700_000  # bytes; heavier SVG pictures make room for their bitmap

STYLE = """
:root { color-scheme: light; }
body { margin: 2rem auto; padding: 0 1.2rem; max-width: 52rem; background: #fff; color: #1d2733;
       font: 1rem/1.45 Georgia, "Times New Roman", serif; }
h1 { font-size: 1.6rem; line-height: 1.2; margin: 0 0 .2rem; }
h2 { font-size: 1.1rem; margin: 2rem 0 .4rem; padding-top: .4rem; border-top: 2px solid #1f6f78; }
header p { margin: 0; color: #4a5560; }
p { margin: .5rem 0; max-width: 44rem; }
section.warnings { margin-top: 1.2rem; padding: .1rem 1rem .4rem; background: #fdf1e2;
                   border-left: .4rem solid #b4551e; }
section.warnings h2 { border: 0; margin-top: .4rem; }
.wide { overflow-x: auto; }
table { border-collapse: collapse; width: 100%; font-variant-numeric: tabular-nums; }
th, td { text-align: left; vertical-align: top; padding: .22rem .9rem .22rem 0; font-weight: normal; }
tbody tr:not(.part) { border-top: 1px solid #d9dee2; }
tbody th { color: #4a5560; width: 17rem; }
thead td { width: 17rem; }
tr.part th { padding-left: 1.2rem; }
thead th { font-size: .85rem; color: #4a5560; }
figure { margin: 1.4rem 0; break-inside: avoid; }
img { max-width: 100%; height: auto; display: block; }
sup { font-size: .72em; line-height: 0; }
@page { size: A4; margin: 18mm 16mm; }
@media print {
  body { margin: 0; padding: 0; max-width: none; font-size: 10pt; }
  h2 { break-after: avoid; margin-top: 1.1rem; }
  tr { break-inside: avoid; }
  .wide { overflow: visible; }
}
@media (max-width: 34rem) {
  body { margin: 1rem auto; }
  th, td { padding-right: .5rem; }
  tbody th, thead td { width: 8rem; }
}
"""

# Title of a block -> the picture that follows it, and words for whoever cannot see it.
PICTURED = {
    "velocity": ("velocity", "Map of the axial velocity over the section; the largest is {velocity}."),
    "wall shear stress": (
        "wall_shear",
        "Wall shear stress against the distance along the wall, and on the outline; its mean is {stress}.",
    ),
    "section": ("section", "The {section} with its mesh and the names of its walls."),
}


def report(outcome: Outcome, pictures: Mapping[str, Mapping[str, bytes]]) -> str:
    """The report of a job.

    ``pictures`` holds each picture, by its name, in each kind, "svg" and "png".
    """
    warnings, inputs, answer, *rest = _with_warnings(outcome)
    shown = [_shown(block, outcome, pictures) for block in (answer, inputs, *rest[:-2])]
    curve = flow_curve_block(outcome.flow.fluid)
    parts = [
        warnings,
        *shown,
        *([block_html(curve)] if curve.rows else []),
        block_html(history_block(outcome.flow)),
        *(block_html(block) for block in rest[-2:]),
    ]
    title = html.escape(outcome.case.title)
    return (
        f'<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8">'
        f'<meta name="viewport" content="width=device-width, initial-scale=1">'
        f"<title>{title}</title><style>{STYLE}</style></head>\n<body>\n"
        f"<header><h1>{title}</h1><p>ductsolve {__version__},"
        f" case file {html.escape(outcome.case.path.name)}</p></header>\n"
        f"{''.join(parts)}</body></html>\n"
    )


def _with_warnings(outcome):
    """The blocks, the first of them the warnings as HTML, empty if there are none."""
    first, *rest = blocks = summary(outcome)
    if first.title != "warnings":
        return ["", *blocks]
    return [block_html(first).replace("<section>", '<section class="warnings">', 1), *rest]


def _shown(block, outcome, pictures):
    """A block, and its picture below: the drawing if it is light enough, else the bitmap."""
    name, words = PICTURED.get(block.title, ("", ""))
    if name not in pictures:
        return block_html(block)
    display = display_of(outcome)
    words = words.format(
        velocity=display.read(outcome.flow.max_velocity, "velocity", 4),
        stress=display.read(outcome.flow.wall_shear.mean, "stress", 4),
        section=outcome.flow.section.name,
    )
    kind = "svg" if len(pictures[name]["svg"]) <= LARGEST_DRAWING else "png"
    picture = picture_html(pictures[name][kind], kind, words)
    return f"{block_html(block)}<figure>{picture}</figure>\n"
