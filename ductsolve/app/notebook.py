"""How a flow shows itself in a notebook: a compact table with its picture."""

from __future__ import annotations

from ductsolve.app import plots
from ductsolve.app.display import Display, digits_for, half_width_text, percent
from ductsolve.app.markup import picture_html, table_html
from ductsolve.app.summary import Row, extent_of
from ductsolve.solver.duty import half_width
from ductsolve.solver.flow import DuctFlow

PICTURE_WIDTH = "max-width: 30em; width: 100%; background: #fff"


def html(flow: DuctFlow) -> str:
    """Table of the answer, its bracket and the wall shear, and the picture of the velocity."""
    display = Display(extent=extent_of(flow))
    scene = plots.scene(flow, display)
    picture = plots.as_bytes(plots.velocity_picture(scene), "png")
    words = f"Axial velocity in the section: {plots.described(flow, display)}"
    shown = picture_html(picture, "png", words, PICTURE_WIDTH)
    return f'<div style="text-align: left">{table_html(_rows(flow, display))}{shown}</div>'


def _rows(flow: DuctFlow, display: Display) -> list[Row]:
    wall = flow.wall_shear
    largest = "unbounded at a re-entrant corner" if len(wall.corners) else _read(display, wall.max, "stress")
    rows = [
        Row("section", (plots.described(flow, display),)),
        Row("fluid", (flow.fluid.law_name,)),
        *_quantity("pressure_gradient", flow, display),
        *_quantity("flow_rate", flow, display),
        Row("mean velocity", (_read(display, flow.mean_velocity, "velocity"),)),
        Row("largest velocity", (_read(display, flow.max_velocity, "velocity"),)),
        Row("wall shear stress, mean", (_read(display, wall.mean, "stress"),)),
        Row("wall shear stress, largest", (largest,)),
        Row("looks unyielded", (f"{percent(flow.plug_fraction, 3)} of the area",)),
        Row("outcome", (flow.status.value,)),
    ]
    return [row for row in rows if flow.fluid.yield_stress > 0 or row.label != "looks unyielded"]


def _read(display: Display, value: float, quantity: str) -> str:
    return display.read(value, quantity, 4)


def _quantity(name: str, flow: DuctFlow, display: Display) -> list[Row]:
    """The given quantity in one row; the one wanted with its bracket."""
    label, value, (low, high) = name.replace("_", " "), getattr(flow, name), getattr(flow, f"{name}_bracket")
    width = half_width((low, high))
    if width == 0:
        return [Row(f"{label}, given" if value else label, (display.read(value, name),))]
    texts = display.bracket(low, value, high, name, digits_for(width))
    low_text, best, high_text = (other or si for si, other in texts)
    return [
        Row(f"{label}, best estimate", (best,)),
        Row("  guaranteed between", (f"{low_text} and {high_text}, {half_width_text(width)}",)),
        Row("  estimated error", (f"{percent(flow.estimated_error)}, not guaranteed",)),
    ]
