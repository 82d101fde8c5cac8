"""What a job came to, as blocks of labelled rows: the terminal and the report show the same ones."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np

from ductsolve.app import reading
from ductsolve.app.display import MOST_DIGITS, SI, Display, digits_for, figures, half_width_text, percent
from ductsolve.app.job import Outcome
from ductsolve.rheology.fluid import Fluid
from ductsolve.rheology.tabulated import FlowCurve
from ductsolve.solver.flow import DuctFlow, Status
from ductsolve.solver.wall import CORNER_DISTANCE

MOST_CORNERS = 3  # re-entrant corners named one by one
UNIFORM = 5e-4  # of the mean: a wall shear stress that varies less shows the same four digits everywhere


class Row(NamedTuple):
    """A label and what stands beside it; a label that starts with two blanks belongs to the row above."""

    label: str
    cells: tuple[str, ...]


@dataclass(frozen=True)
class Block:
    """A titled group of rows, with explanations in full sentences below.

    Attributes
    ----------
    title : in a few words
    rows : label and cells; numbers stand in SI first, then in the unit they are read in
    header : titles of the cells, or none
    notes : sentences
    """

    title: str
    rows: tuple[Row, ...] = ()
    header: tuple[str, ...] = ()
    notes: tuple[str, ...] = field(default=())


def summary(outcome: Outcome) -> list[Block]:
    """All blocks of a job, in the order in which they are read."""
    display = display_of(outcome)
    blocks = [
        warning_block(outcome),
        input_block(outcome),
        answer_block(outcome, display),
        velocity_block(outcome, display),
        wall_block(outcome.flow, display),
        plug_block(outcome.flow),
        regime_block(outcome),
        section_block(outcome, display),
        work_block(outcome),
        Block("what is guaranteed, and what is not", notes=reading.GUARANTEE),
        Block("cautions", notes=reading.CAUTIONS),
    ]
    return [block for block in blocks if block.rows or block.notes]


def display_of(outcome: Outcome) -> Display:
    """How the numbers of a case are shown."""
    return Display(outcome.case.report, extent_of(outcome.flow))


def extent_of(flow: DuctFlow) -> float:
    """Length that picks the unit of a section's lengths [m]."""
    return min(flow.section.hydraulic_diameter, float(np.ptp(flow.mesh.points, axis=0).max()))


def warning_block(outcome: Outcome) -> Block:
    """Warnings, and an answer that falls short."""
    short = () if outcome.settled else (outcome.flow.status.value,)
    return Block("warnings", notes=tuple(text[0].upper() + text[1:] for text in (*short, *outcome.warnings)))


def input_block(outcome: Outcome) -> Block:
    """Every input as given and in SI, the words of each table before its numbers."""
    tables = list(dict.fromkeys(item.label.split()[0] for item in outcome.case.inputs))
    ordered = sorted(
        outcome.case.inputs, key=lambda item: (tables.index(item.label.split()[0]), item.value is not None)
    )
    rows = []
    for item in ordered:
        si = "" if item.value is None else f"{figures(item.value, 6)} {item.unit}".strip()
        rows.append(Row(item.label, (item.text, si if si != item.text else "")))
    return Block("inputs", tuple(rows), ("as given", "in SI units"))


# --- the answer ---------------------------------------------------------------------------------------


def answer_block(outcome: Outcome, display: Display) -> Block:
    """The answer with its bracket, and the pressure drop where there is a length."""
    rows = [Row("outcome", (outcome.flow.status.value,))]
    if outcome.flow.status is Status.NO_FLOW:
        rows += _no_flow_rows(outcome, display)
    elif outcome.gradient_wanted:
        rows += _wanted_rows(outcome, display, "pressure_gradient") + _accuracy_rows(outcome)
        rows += _drop_rows(outcome, display)
        rows.append(Row("flow rate, given", display.both(outcome.flow.flow_rate, "flow_rate")))
    else:
        rows += _wanted_rows(outcome, display, "flow_rate") + _accuracy_rows(outcome)
        rows += _given_gradient_rows(outcome, display)
    return Block("answer", tuple(rows), ("in SI units", "in other units"))


def _no_flow_rows(outcome, display):
    return [
        Row("flow rate", display.both(0.0, "flow_rate")),
        Row("  why", ("a stress in balance stays at or below the yield stress everywhere",)),
        *_given_gradient_rows(outcome, display),
    ]


def _given_gradient_rows(outcome, display):
    gradient = outcome.flow.pressure_gradient
    rows = [Row("pressure gradient, given", display.both(gradient, "pressure_gradient"))]
    length = outcome.case.length
    if length is not None:
        over = f"pressure drop over {display_length(outcome)}"
        rows.append(Row(over, display.both(gradient * length, "pressure_drop")))
    return rows


def _wanted_rows(outcome, display, quantity, per_unit=1.0, label=""):
    """Best estimate and bracket of a quantity; ``per_unit`` turns a gradient into a pressure drop."""
    flow = outcome.flow
    name = "pressure_gradient" if outcome.gradient_wanted else "flow_rate"
    value, bracket = getattr(flow, name) * per_unit, getattr(flow, f"{name}_bracket")
    digits = digits_for(outcome.half_width)
    ends = (bracket[0] * per_unit, value, bracket[1] * per_unit)
    low, best, high = display.bracket(*ends, quantity, digits)
    return [
        Row(label or quantity.replace("_", " "), ()),
        Row("  best estimate", best),
        Row("  guaranteed between", low),
        Row("  and", high),
    ]


def _accuracy_rows(outcome):
    asked = f"(asked +/- {percent(outcome.case.accuracy, 4)})"
    error = percent(outcome.flow.estimated_error)
    return [
        Row("  half-width of that bracket", (f"{half_width_text(outcome.half_width)} {asked}",)),
        Row("  estimated error", (f"{error} of the estimate, not guaranteed",)),
    ]


def _drop_rows(outcome, display):
    if outcome.case.length is None:
        return []
    label = f"pressure drop over {display_length(outcome)}"
    return _wanted_rows(outcome, display, "pressure_drop", outcome.case.length, label)


def display_length(outcome: Outcome) -> str:
    """The duct's length as the case gives it."""
    given = [item.text for item in outcome.case.inputs if item.label == "duty length"]
    return given[0] if given else f"{figures(outcome.case.length)} m"


# --- what the flow is like ----------------------------------------------------------------------------


def velocity_block(outcome: Outcome, display: Display) -> Block:
    """Mean and largest velocity."""
    if not outcome.moves:
        return Block("velocity")
    mean = outcome.flow.mean_velocity
    rows = (
        Row("mean", display.both(mean, "velocity", 4, padded=True)),
        Row("largest", display.both(outcome.flow.max_velocity, "velocity", 4, padded=True)),
        Row("largest over mean", (figures(outcome.flow.max_velocity / mean, 4, padded=True),)),
    )
    return Block("velocity", rows)


def wall_block(flow: DuctFlow, display: Display) -> Block:
    """Wall shear stress: smallest, mean, largest, and where."""
    wall = flow.wall_shear
    if flow.flow_rate <= 0:
        rows = (Row("mean", display.both(wall.mean, "stress", 4, padded=True)),)
        return Block("wall shear stress", rows, notes=(reading.MEAN_STRESS, reading.STRESS_AT_REST))
    if wall.stress.max() - wall.min < UNIFORM * wall.mean:
        rows = (Row("everywhere", display.both(wall.mean, "stress", 4, padded=True)),)
        return Block("wall shear stress", rows, notes=(reading.MEAN_STRESS,))
    rows = [
        *_stress_rows("smallest", *wall.smallest, wall, display),
        Row("mean", display.both(wall.mean, "stress", 4, padded=True)),
    ]
    notes = [reading.MEAN_STRESS, reading.WALL_PIECES]
    if len(wall.corners):
        rows += _corner_rows(wall, display)
        rows += _stress_rows("largest away from them", *wall.largest_away, wall, display)
        away = CORNER_DISTANCE * flow.section.hydraulic_diameter
        notes.append(reading.REENTRANT.format(away=display.read(away, "length", 3)))
    else:
        rows += _stress_rows("largest", *wall.largest_away, wall, display)
    return Block("wall shear stress", tuple(rows), notes=tuple(notes))


def _corner_rows(wall, display):
    """The largest stress is no number at a re-entrant corner."""
    named = ", ".join(display.place(corner) for corner in wall.corners[:MOST_CORNERS])
    more = len(wall.corners) - MOST_CORNERS
    where = f"{named} and {more} more" if more > 0 else named
    corners = "corners" if len(wall.corners) > 1 else "corner"
    return [Row("largest", (f"unbounded at the re-entrant {corners} {where}",))]


def _stress_rows(label, stress, position, wall, display):
    at = int(np.argmin(np.linalg.norm(wall.position - position, axis=1)))
    where = f"{display.place(position)}, {wall.names[wall.wall[at]]}"
    return [Row(label, display.both(stress, "stress", 4, padded=True)), Row("  at", (where,))]


def plug_block(flow: DuctFlow) -> Block:
    """Unyielded fluid, for fluids with a yield stress that move."""
    if flow.fluid.yield_stress == 0 or flow.flow_rate <= 0:
        return Block("plug")
    plug = flow.plug
    proved = f"{percent(plug.proved, 3)} of the area" if plug.proved else reading.NONE_PROVED
    rows = (
        Row("looks unyielded", (f"{percent(plug.apparent, 3)} of the area",)),
        Row("proved nearly rigid", (proved,)),
    )
    note = reading.PLUG.format(rate=figures(plug.slow_rate, 3))
    return Block("plug", rows, notes=(note,))


def regime_block(outcome: Outcome) -> Block:
    """Reynolds numbers and whether laminar flow is to be expected."""
    title = "Reynolds number"
    if outcome.case.density is None:
        return Block(title, (Row("generalised, by friction", ("not worked out: no density given",)),))
    if outcome.regime is None:
        proved = outcome.flow.status is Status.NO_FLOW
        why = "0: nothing flows" if proved else "0: nothing flows, by the best estimate"
        return Block(title, (Row("generalised, by friction", (why,)),))
    found = outcome.regime
    factors = f"a = {figures(found.factors.a, 3)}, b = {figures(found.factors.b, 3)}"
    if found.law is None:
        rows = [Row("generalised", ("not worked out", "mean wall shear stress not above the yield stress"))]
    else:
        n = figures(found.law.index, 3)
        unit = "Pa.s" if n == "1" else f"Pa.s^{n}"
        law = f"n = {n}, K = {figures(found.law.consistency, 3)} {unit}"
        whose = "the fluid's own" if found.law.whole_curve else "tangent at the mean wall shear stress"
        rows = [
            Row("generalised", (figures(found.generalised, 3), "Kozicki, Chou and Tiu 1966, see below")),
            Row("  power law in it", (law, whose)),
            Row("  shape factors in it", (factors, "from a Newtonian solve of this section")),
        ]
    rows.append(Row("by friction", (figures(found.friction, 3), "16 / Fanning friction factor, see below")))
    labels = ["laminar up to", *[""] * (len(found.limits) - 1)]
    rows += [
        Row(label, (figures(limit, 4), reading.LIMITS[rule]))
        for label, (rule, limit) in zip(labels, found.limits.items(), strict=True)
    ]
    rows.append(Row("regime", (found.outlook.value,)))
    return Block(title, tuple(rows), notes=reading.REYNOLDS)


# --- the rest -----------------------------------------------------------------------------------------


def section_block(outcome: Outcome, display: Display) -> Block:
    """Area, wetted perimeter, hydraulic diameter."""
    section, length = outcome.flow.section, display.length
    si = SI["length"][0]
    rows = [
        Row("shape", (section.name,)),
        Row("area", _powers(section.area, length, si, 2)),
        Row("wetted perimeter", _powers(section.perimeter, length, si, 1)),
        Row("hydraulic diameter", _powers(section.hydraulic_diameter, length, si, 1)),
    ]
    return Block("section", tuple(rows), notes=(reading.HYDRAULIC_DIAMETER,))


def _powers(value, length, si, power):
    suffix = f"^{power}" if power > 1 else ""
    texts = [
        f"{figures(value, padded=True)} {si}{suffix}",
        f"{figures(value * length.per_si**power, padded=True)} {length.unit}{suffix}",
    ]
    return tuple(texts) if length.unit != si else (texts[0],)


def work_block(outcome: Outcome) -> Block:
    """What the computation took."""
    flow = outcome.flow
    part, whole = flow.history[-1].triangles, len(flow.mesh.triangles)
    solved = f"{part} solved, {whole} in the whole section by symmetry" if whole > part else f"{part}"
    systems = sum(record.stress_steps + record.velocity_steps for record in flow.history)
    rows = (
        Row("triangles", (solved,)),
        Row("levels of refinement", (str(len(flow.history)),)),
        Row("linear systems solved", (str(systems),)),
        Row("time", (f"{figures(outcome.seconds, 2)} s",)),
    )
    return Block("computation", rows)


def flow_curve_block(fluid: Fluid) -> Block:
    """The points of a flow curve, for fluids given by one."""
    if not isinstance(fluid, FlowCurve):
        return Block("flow curve")
    rows = tuple(
        Row(f"point {number}", (f"{figures(rate, MOST_DIGITS)} 1/s", f"{figures(stress, MOST_DIGITS)} Pa"))
        for number, (rate, stress) in enumerate(zip(fluid.shear_rate, fluid.shear_stress, strict=True), 1)
    )
    return Block("flow curve", rows, ("shear rate", "shear stress"))


def history_block(flow: DuctFlow) -> Block:
    """How the bracket closed in from level to level."""
    rows = tuple(
        Row(
            f"level {number}",
            (
                str(record.triangles),
                str(record.stress_steps + record.velocity_steps),
                percent(record.gap),
                "not worked out" if record.half_width is None else half_width_text(record.half_width),
            ),
        )
        for number, record in enumerate(flow.history, 1)
    )
    header = ("triangles solved", "linear systems", "gap of the potential", "guaranteed")
    return Block("how the bracket closed in", rows, header, (reading.HISTORY,))
