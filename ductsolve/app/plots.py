"""Pictures of a flow: the section, the velocity, the wall shear stress."""

from __future__ import annotations

import io
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.path import Path
from matplotlib.ticker import MaxNLocator

from ductsolve.app.case import ReportUnit
from ductsolve.app.colours import HATCH, INK, MESH, STRESS, VELOCITY
from ductsolve.app.display import Display, figures
from ductsolve.app.drawing import Drawing, drawing, mesh_lines, smoothed, wall_pieces
from ductsolve.app.views import View, view_of
from ductsolve.post.along_wall import wall_loops
from ductsolve.post.shear import nodal_shear_stress
from ductsolve.solver.flow import DuctFlow

PAGE_WIDTH = 7.2  # inches
LOWEST, TALLEST = 2.6, 6.6
SMALL, NORMAL = 8, 9  # points
RESOLUTION = 150  # dots per inch
LEVELS, MOST_TICKS = 12, 10
FEW_LINES, MANY_LINES = 2_000, 6_000  # more are drawn thinner, and stored as a bitmap
MOST_NAMES = 8
FARTHEST = 0.01  # of the picture: walls that lie so little nearer also count as farthest out
MOST_PLUGS = 12  # pieces of unyielded fluid, above which their ragged edges are not drawn
SPARE, SPARE_STRETCHED = 0.08, 0.18  # of the extents, left free around the section
SHORT_STRETCH = 0.08  # of the walk: shorter walls are not named beside the curve
CURVES_HEIGHT, STRETCHED_HEIGHT, TALL_HEIGHT, MARGIN = 2.2, 1.7, 4.0, 0.7  # inches


@dataclass(frozen=True, eq=False)
class Scene:
    """A flow made ready to be drawn.

    Attributes
    ----------
    flow, display, view : what, in which units, how laid on paper
    mesh : fine straight triangles of the whole section
    pieces : (n, k, 2) pieces of wall in the order of the wall shear [m]
    """

    flow: DuctFlow
    display: Display
    view: View
    mesh: Drawing
    pieces: np.ndarray


def scene(flow: DuctFlow, display: Display) -> Scene:
    """Make a flow ready to be drawn."""
    return Scene(flow, display, view_of(flow, display.length), drawing(flow.mesh), wall_pieces(flow))


def as_bytes(figure: Figure, kind: str) -> bytes:
    """Picture as a file of kind ``"png"`` or ``"svg"``."""
    stream = io.BytesIO()
    figure.savefig(stream, format=kind, dpi=RESOLUTION, metadata={"Date": None} if kind == "svg" else None)
    return stream.getvalue()


# --- the pictures -------------------------------------------------------------------------------------


def section_picture(of: Scene) -> Figure:
    """The section with its mesh and the names of its walls."""

    def draw(axes: Axes) -> None:
        lines, _ = of.view.lines(mesh_lines(of.flow.mesh))
        many = len(lines) > MANY_LINES
        width = 0.4 * min(1.0, (FEW_LINES / len(lines)) ** 0.5)
        axes.add_collection(LineCollection(lines, colors=MESH, linewidths=width, rasterized=many))
        _outline(axes, of)

    words = described(of.flow, of.display)
    figure = _figure(of, draw, words[0].upper() + words[1:])
    _wall_names(figure.axes[0], of)
    return figure


def velocity_picture(of: Scene) -> Figure:
    """Axial velocity in filled contours, what looks unyielded hatched."""
    unit = of.display.unit("velocity", of.flow.max_velocity)
    velocity = of.mesh.values(of.flow.velocity) * unit.per_si
    levels = MaxNLocator(LEVELS).tick_values(0.0, float(velocity.max()) or 1.0)
    velocity = np.clip(velocity, 0.0, levels[-1])
    yields = of.flow.fluid.yield_stress > 0
    # The stress is linear on a triangle, so its square is what the quadratic shape functions carry.
    nodal = smoothed(of.flow.mesh, nodal_shear_stress(of.flow) ** 2) if yields else None
    squared = of.mesh.values(nodal) if yields else None
    points, triangles, source = of.view.triangles(of.mesh.points, of.mesh.triangles)

    def draw(axes: Axes):
        filled = axes.tricontourf(*points.T, triangles, velocity[source], levels=levels, cmap=VELOCITY)
        filled.set_edgecolor("face")  # hides hairlines between the bands
        if yields:
            _hatch(axes, points, triangles, squared[source] / of.flow.fluid.yield_stress**2)
        _outline(axes, of)
        return filled if velocity.any() else None

    title = "Axial velocity" if velocity.any() else "Nothing flows"
    title += "; hatched: looks unyielded" if yields else ""
    return _figure(of, draw, title, f"velocity [{unit.unit}]")


def wall_shear_picture(of: Scene) -> Figure:
    """Wall shear stress over the distance along the wall, and on the outline."""
    wall = of.flow.wall_shear
    top = wall.largest_away[0]
    unit = of.display.unit("stress", top)
    lines, source = of.view.lines(of.pieces)

    def draw(axes: Axes):
        coloured = LineCollection(lines, cmap=STRESS, linewidths=5, capstyle="butt", snap=False)
        coloured.set_array(wall.stress[source] * unit.per_si)
        coloured.set_clim(0, top * unit.per_si)
        return axes.add_collection(coloured)

    label = f"wall shear stress [{unit.unit}]"
    figure = _figure(of, draw, "The same on the outline", label, curves=True)
    axes = figure.axes[0]
    _stress_curves(axes, of, unit)
    axes.set_ylim(0, 1.1 * top * unit.per_si)
    axes.set_ylabel(label, fontsize=NORMAL, color=INK)
    return figure


def described(flow: DuctFlow, display: Display) -> str:
    """The section in words, with its dimensions."""
    length = display.length
    sizes = [
        f"{name.replace('_', ' ')} {figures(value, 4)}"
        if name == "eccentricity"
        else f"{name.replace('_', ' ')} {figures(value * length.per_si, 6)} {length.unit}"
        for name, value in flow.section.dimensions.items()
        if value
    ]
    return ", ".join([flow.section.name, *sizes])


# --- parts of a picture -------------------------------------------------------------------------------


def _figure(of: Scene, draw: Callable, title: str, colour_label: str = "", curves: bool = False) -> Figure:
    """Figure with the section drawn whole, and its end at true scale where it is slender.

    With ``curves`` an empty panel comes first.
    """
    mosaic, ratios = _layout(of.view, bool(colour_label), curves)
    size = (PAGE_WIDTH, sum(ratios["height_ratios"]) + MARGIN * len(mosaic))
    figure = Figure(figsize=size, layout="constrained")
    panels = figure.subplot_mosaic(mosaic, **ratios)
    for axes in panels.values():
        axes.tick_params(labelsize=SMALL, color=INK, labelcolor=INK)
        axes.spines[["top", "right"]].set_visible(False)
    whole, end = panels["whole"], [panels["end"]] if "end" in panels else []
    coloured = draw(whole)
    _frame(whole, of.view, of.view.extents, true_scale=not of.view.stretched)
    whole.set_title(title, fontsize=NORMAL, loc="left", color=INK)
    for axes in end:
        draw(axes)
        _frame(axes, of.view, of.view.end, true_scale=True)
        axes.set_title("One end at true scale", fontsize=NORMAL, loc="left", color=INK)
    if coloured is not None:
        bands = getattr(coloured, "levels", None)  # of filled contours; round, and every other named
        ticks = MaxNLocator(8) if bands is None else bands[:: 1 + len(bands) // MOST_TICKS]
        bar = figure.colorbar(coloured, ax=[whole, *end], aspect=30, pad=0.02, ticks=ticks)
        bar.set_label(colour_label, fontsize=NORMAL, color=INK)
        bar.ax.tick_params(labelsize=SMALL)
    if of.view.stretched:
        _say_how_stretched(figure, whole, of.view)
    return figure


def _layout(view: View, coloured: bool, curves: bool) -> tuple[list[list[str]], dict]:
    """Panels row by row, the curves first, and their proportions [inches]."""
    if view.end is None:
        rows, heights = [["whole"]], [STRETCHED_HEIGHT if view.stretched else _height(view, coloured)]
    elif view.long == 0:
        rows, heights = [["whole"], ["end"]], [STRETCHED_HEIGHT] * 2
    else:
        rows, heights = [["whole", "end"]], [TALL_HEIGHT]
    if curves:
        rows, heights = [["curves"] * len(rows[0]), *rows], [CURVES_HEIGHT, *heights]
    return rows, {"height_ratios": heights, "width_ratios": [2, 1][: len(rows[0])]}


def _height(view: View, coloured: bool) -> float:
    """Height of a panel with a section drawn to scale [inches]."""
    width, height = np.ptp(view.extents, axis=0)
    room = PAGE_WIDTH - (2.0 if coloured else 1.0)
    return float(np.clip(room * height / width, LOWEST, TALLEST))


def _frame(axes: Axes, view: View, extents: np.ndarray, true_scale: bool) -> None:
    """Limits, scale and labels of a panel with the section."""
    size = np.ptp(extents, axis=0)
    spare = np.full(2, SPARE * size.max())
    if not true_scale:
        spare[1 - view.long] = SPARE_STRETCHED * size[1 - view.long]
    if view.ring:
        spare[0] = 0.0
    (left, bottom), (right, top) = extents[0] - spare, extents[1] + spare
    axes.set_xlim(left, right)
    axes.set_ylim(bottom, top)
    axes.set_aspect("equal" if true_scale else "auto")
    if true_scale and size[1] > 2 * size[0]:
        axes.xaxis.set_major_locator(MaxNLocator(2))
    axes.set_xlabel(view.labels[0], fontsize=NORMAL, color=INK)
    axes.set_ylabel(view.labels[1], fontsize=NORMAL, color=INK)


def _say_how_stretched(figure: Figure, axes: Axes, view: View) -> None:
    """Name the direction that is drawn on a larger scale, and how much larger."""
    figure.draw_without_rendering()
    box = axes.get_window_extent()
    scale = np.array([box.width / np.ptp(axes.get_xlim()), box.height / np.ptp(axes.get_ylim())])
    factor = f"stretched {figures(scale.max() / scale.min(), 2)} times"
    if scale[1] > scale[0]:
        axes.set_ylabel(f"{view.labels[1]}\n{factor}", fontsize=NORMAL, color=INK)
    else:
        axes.set_xlabel(f"{view.labels[0]}, {factor}", fontsize=NORMAL, color=INK)


def _outline(axes: Axes, of: Scene) -> None:
    lines, _ = of.view.lines(of.pieces)
    axes.add_collection(LineCollection(lines, colors=INK, linewidths=1.4, capstyle="round", snap=False))


def _hatch(axes: Axes, points, triangles, ratio) -> None:
    """Hatch and outline where (stress/yield stress)^2 is at most one."""
    if ratio.min() >= 1:
        return
    below = axes.tricontourf(*points.T, triangles, ratio, levels=[-9.0, 1.0], colors="none", hatches=["////"])
    below.set_edgecolor(HATCH)
    (path,) = below.get_paths()
    pieces = np.count_nonzero(path.codes == Path.MOVETO)
    below.set_linewidth(1.0 if pieces <= MOST_PLUGS else 0.0)


def _wall_names(axes: Axes, of: Scene) -> None:
    """Write each wall's name beside its longest stretch."""
    wall, longest = of.flow.wall_shear, {}
    for loop in wall_loops(wall):
        for first, last, name in loop.stretches:
            rows = loop.rows[first:last]
            longest.setdefault((loop.number, name), rows)
            if wall.length[rows].sum() > wall.length[longest[loop.number, name]].sum():
                longest[loop.number, name] = rows
    if len(longest) > MOST_NAMES:
        return
    for (number, name), rows in longest.items():
        if number and len(rows) == np.count_nonzero(wall.loop == number) and not of.view.ring:
            middle = wall.position[rows].mean(axis=0) * of.view.unit.per_si
            axes.text(*middle, name, ha="center", va="center", fontsize=NORMAL, color=INK)
        else:
            _name_beside(axes, of, rows, name)


def _name_beside(axes: Axes, of: Scene, rows: np.ndarray, name: str) -> None:
    """Write a name outside the fluid where a wall lies farthest out; the fluid is on its left."""
    lines = of.view.lines(of.pieces[rows])[0][: len(rows)]
    middle = axes.transData.transform(lines[:, lines.shape[1] // 2])
    along = axes.transData.transform(lines[:, -1]) - axes.transData.transform(lines[:, 0])
    normal = np.column_stack([along[:, 1], -along[:, 0]]) / np.hypot(*along.T)[:, None]
    reach = np.einsum("nd,nd->n", middle - axes.transData.transform(of.view.extents).mean(axis=0), normal)
    farthest = np.flatnonzero(reach >= reach.max() - FARTHEST * np.ptp(axes.bbox.extents))
    at = farthest[len(farthest) // 2]
    outward, line = normal[at], lines[at]
    sideways = "center" if abs(outward[0]) < 0.5 else "left" if outward[0] > 0 else "right"
    upright = "center" if abs(outward[1]) < 0.5 else "bottom" if outward[1] > 0 else "top"
    axes.annotate(
        name,
        line[len(line) // 2],
        xytext=8 * outward,
        textcoords="offset points",
        ha=sideways,
        va=upright,
        fontsize=NORMAL,
        color=INK,
        rotation=90 if abs(outward[0]) > 0.9 else 0,
    )


def _stress_curves(axes: Axes, of: Scene, unit: ReportUnit) -> None:
    """Stress over distance, a curve for each outline, with the places where walls change."""
    wall, length = of.flow.wall_shear, of.display.length
    loops = wall_loops(wall)
    shades = STRESS(np.linspace(0.85, 0.45, len(loops)))
    for loop, shade in zip(loops, shades, strict=True):
        names = {name for _, _, name in loop.stretches}
        label = names.pop() if len(names) == 1 else f"hole {loop.number}" if loop.number else "outer outline"
        distance, stress = loop.distance * length.per_si, wall.stress[loop.rows] * unit.per_si
        axes.plot(distance, stress, color=shade, linewidth=1.5, label=label)
    _name_stretches(axes, wall, loops[0], length.per_si)
    if len(loops) > 1:
        axes.legend(fontsize=SMALL, frameon=False)
    note = "; unbounded at re-entrant corners" if len(wall.corners) else ""
    if of.flow.flow_rate <= 0:
        note = "; one way of many to carry the load while nothing flows"
    axes.set_title(f"Wall shear stress along the wall{note}", fontsize=NORMAL, loc="left", color=INK)
    axes.set_xlabel(f"distance along the wall [{length.unit}]", fontsize=NORMAL, color=INK)
    axes.set_xlim(0, max(loop.distance[-1] for loop in loops) * length.per_si * 1.01)


def _name_stretches(axes: Axes, wall, loop, per_si: float) -> None:
    """Mark where the walls of an outline change, and name the long ones."""
    if not 1 < len(loop.stretches) <= MOST_NAMES:
        return
    for first, last, name in loop.stretches:
        rows = loop.rows[first:last]
        start, walked = loop.distance[first] - wall.length[rows[0]] / 2, wall.length[rows].sum()
        axes.axvline(start * per_si, color=MESH, linewidth=0.6)
        if walked > SHORT_STRETCH * loop.distance[-1]:
            place = (start + walked / 2) * per_si
            axes.text(place, 0.03, name, transform=axes.get_xaxis_transform(), fontsize=SMALL, ha="center")
