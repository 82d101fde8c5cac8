"""Blocks and pictures as HTML that needs nothing from outside."""

from __future__ import annotations

import base64
import html
import re
from collections.abc import Sequence

from ductsolve.app.summary import Block, Row

# In brackets, which may hold others, or a single number or word.
_POWER = re.compile(r"\^(?:\(((?:[^()]|\([^()]*\))+)\)|(-?\w+(?:\.\w+)?))")


def escaped(text: str) -> str:
    """Text for HTML, powers raised and plus-minus signs set."""
    safe = html.escape(text).replace("+/-", "±")
    return _POWER.sub(lambda found: f"<sup>{found[1] or found[2]}</sup>", safe)


def block_html(block: Block) -> str:
    """A block as a section with its table and its sentences."""
    title = html.escape(block.title[0].upper() + block.title[1:])
    notes = "".join(f"<p>{escaped(note)}</p>" for note in block.notes)
    return f"<section><h2>{title}</h2>{table_html(block.rows, block.header)}{notes}</section>\n"


def table_html(rows: Sequence[Row], header: Sequence[str] = ()) -> str:
    """Rows as a table, empty if there are none."""
    if not rows:
        return ""
    columns = max(len(row.cells) for row in rows)
    titles = "".join(f'<th scope="col">{escaped(title)}</th>' for title in header)
    head = f"<thead><tr><td></td>{titles}</tr></thead>" if header else ""
    body = "".join(_row(row, columns) for row in rows)
    return f'<div class="wide"><table>{head}<tbody>{body}</tbody></table></div>'


def _row(row, columns):
    """A row; its last cell takes the room of those that are missing."""
    kind = ' class="part"' if row.label.startswith("  ") else ""
    cells = [cell for cell in row.cells if cell] or [""]
    span = f' colspan="{columns - len(cells) + 1}"' if len(cells) < columns else ""
    *first, last = cells
    inner = "".join(f"<td>{escaped(cell)}</td>" for cell in first) + f"<td{span}>{escaped(last)}</td>"
    return f'<tr{kind}><th scope="row">{escaped(row.label.strip())}</th>{inner}</tr>'


def picture_html(data: bytes, kind: str, words: str, style: str = "") -> str:
    """A picture inside the page, with words for whoever cannot see it."""
    encoded = base64.b64encode(data).decode("ascii")
    mime = "image/svg+xml" if kind == "svg" else "image/png"
    extra = f' style="{style}"' if style else ""
    return f'<img src="data:{mime};base64,{encoded}" alt="{html.escape(words)}"{extra}>'
