"""Case files: one readable TOML file that says what flows, where and how fast."""

from __future__ import annotations

import inspect
from dataclasses import dataclass, fields
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

from ductsolve.app import units
from ductsolve.app.flow_curve import read_flow_curve
from ductsolve.app.schema import Input, Table, blamed_on, listed, read_toml

if TYPE_CHECKING:
    from ductsolve.mesh.sections import Section
    from ductsolve.rheology.fluid import Fluid

DEFAULT_ACCURACY = 0.01

TABLES = {"section": True, "fluid": True, "duty": True, "report": False}  # name -> required
DIMENSIONS = {
    "rectangle": ("width", "height"),
    "circle": ("diameter",),
    "ellipse": ("width", "height"),
    "annulus": ("outer_diameter", "inner_diameter"),
    "file": ("file", "unit"),
}
REPORTED = {
    "pressure_gradient": ("pressure gradient",),
    "pressure_drop": ("pressure",),
    "flow_rate": ("volume flow", "mass flow"),
    "velocity": ("velocity",),
    "stress": ("stress",),
    "length": ("length",),
}
# SI unit of a law's parameter, as the law states it -> kind of quantity.
PARAMETER_KINDS = {"Pa": "stress", "Pa.s": "viscosity", "s": "time", "1/s": "shear rate"}
CONSISTENCY, PURE_NUMBER = "Pa.s^n", "-"
FLOW_CURVE = "flow curve"


@dataclass(frozen=True)
class ReportUnit:
    """A unit in which answers are shown beside SI: ``value_in_unit = per_si * value_in_SI``."""

    quantity: str
    unit: str
    per_si: float


@dataclass(frozen=True, eq=False)
class Case:
    """A case as read, in SI units.

    Attributes
    ----------
    title : what the case is called
    section, fluid : where it flows and what
    density : of the fluid [kg/m3], None if not given
    pressure_gradient, flow_rate : exactly one is given [Pa/m], [m3/s]; the other is None
    length : of the duct [m], None if not given
    accuracy : relative half-width asked of the bracket
    path : the case file
    inputs : every input in the order of the file's tables, for the echo in the report
    report : units in which to show answers beside SI, those of the duty included
    """

    title: str
    section: Section
    fluid: Fluid
    density: float | None
    pressure_gradient: float | None
    flow_rate: float | None
    length: float | None
    accuracy: float
    path: Path
    inputs: tuple[Input, ...]
    report: tuple[ReportUnit, ...]


def read_case(path: str | Path) -> Case:
    """Read a case file.

    Raises
    ------
    CaseError
        in one line that names the file and the key, for whatever is missing, unknown or wrong.
    """
    path = Path(path)
    inputs: list[Input] = []
    top = Table(f"{path}:", "", read_toml(path), inputs)
    section, fluid, duty, report = _tables(top, path)
    title = top.text("title") if "title" in top else path.stem
    the_section = _section(section, path.parent)
    density = fluid.quantity("density", "density") if "density" in fluid else None
    the_fluid = _fluid(fluid, path.parent)
    return Case(
        title=title,
        section=the_section,
        fluid=the_fluid,
        density=density,
        **_duty(duty, density),
        path=path,
        inputs=tuple(inputs),
        report=_report(report, duty, density),
    )


def _tables(top: Table, path: Path) -> list[Table]:
    """The tables of a case, with none missing and none unknown."""
    top.check_keys([], ["title", *TABLES], "a case")
    missing = [f"[{name}]" for name, required in TABLES.items() if required and name not in top]
    if missing:
        raise top.error(f"missing {listed(missing)}; a case needs [section], [fluid] and [duty]")
    for name in TABLES:
        if not isinstance(top.values.get(name, {}), dict):
            raise top.error(f"must be a table: a line [{name}], then its keys below", name)
    return [Table(f"{path}: [{name}]", name, top.values.get(name, {}), top.inputs) for name in TABLES]


# --- section -----------------------------------------------------------------------------------------


def _section(table: Table, folder: Path) -> Section:
    """Section of the shape and dimensions given."""
    from ductsolve.mesh import sections

    if "shape" not in table:
        raise table.error(f"missing shape; it is one of {', '.join(DIMENSIONS)}")
    shape = table.choice("shape", DIMENSIONS)
    optional = ("eccentricity", "offset") if shape == "annulus" else ()
    owner = "a section from a file" if shape == "file" else f"a section of shape {shape}"
    table.check_keys(["shape", *DIMENSIONS[shape]], optional, owner)
    if shape == "file":
        return _section_file(table, folder)
    lengths = [table.quantity(key, "length") for key in DIMENSIONS[shape]]
    with blamed_on(table.place):
        section = getattr(sections, shape)(*lengths)
    key = next((key for key in optional if key in table), None)
    if key is None:
        return section
    eccentricity = _eccentricity(table, *lengths)
    with blamed_on(table.where(key)):
        return sections.annulus(*lengths, eccentricity)


def _eccentricity(table: Table, outer: float, inner: float) -> float:
    """Distance of the centres over the difference of the radii, given as such or as a length."""
    if "eccentricity" in table and "offset" in table:
        raise table.error("gives both eccentricity and offset, which say the same; keep one")
    if "eccentricity" in table:
        return table.number("eccentricity")
    offset, gap = table.quantity("offset", "length", zero=True), (outer - inner) / 2
    if offset > gap:
        raise table.error(f"{offset:g} m exceeds the mean gap of {gap:g} m: the circles cross", "offset")
    return offset / gap


def _section_file(table: Table, folder: Path) -> Section:
    """Section read from a mesh file whose coordinates are in the unit given."""
    from ductsolve.mesh.files import read_section

    name, unit = table.text("file"), table.text("unit")
    size = units.scale(unit, "length", where=table.where("unit"))
    table.note("file", name)
    table.note("unit", unit, size, "m")
    with blamed_on(table.where("file")):
        return read_section(folder / name, unit=size)


# --- fluid -------------------------------------------------------------------------------------------


def _fluid(table: Table, folder: Path) -> Fluid:
    """Fluid of the law and parameters given."""
    from ductsolve.rheology import laws

    known = {getattr(laws, name).law_name: getattr(laws, name) for name in laws.__all__}
    if "law" not in table:
        raise table.error(f"missing law; it is one of {', '.join([*known, FLOW_CURVE])}")
    name = table.choice("law", [*known, FLOW_CURVE])
    if name == FLOW_CURVE:
        return read_flow_curve(table, folder)
    parameters = _law_parameters(known[name])
    required = [item.name for item in parameters if item.required]
    optional = [item.name for item in parameters if not item.required]
    table.check_keys(["law", *required], [*optional, "density"], f"the {name} law")
    values = _parameter_values(table, [item for item in parameters if item.name in table])
    with blamed_on(table.place):
        return known[name](**values)


class _Parameter(NamedTuple):
    """What the case file may say about one parameter of a law."""

    name: str
    unit: str
    required: bool


def _law_parameters(law: type) -> list[_Parameter]:
    """Arguments of a law's constructor, with the SI units its fields state in the same order."""
    arguments = inspect.signature(law).parameters.values()
    return [
        _Parameter(argument.name, item.metadata["unit"], argument.default is argument.empty)
        for argument, item in zip(arguments, fields(law), strict=True)
    ]


def _parameter_values(table: Table, parameters: list[_Parameter]) -> dict[str, float]:
    """Parameters in SI; the plain numbers come first, for a consistency needs the index."""
    values = {}
    for name, unit, _ in sorted(parameters, key=lambda item: item.unit != PURE_NUMBER):
        if unit == PURE_NUMBER:
            values[name] = table.number(name)
        elif unit == CONSISTENCY:
            values[name] = table.consistency(name, values["index"])
        else:
            values[name] = table.quantity(name, PARAMETER_KINDS[unit], zero=True)
    return values


# --- duty and report ---------------------------------------------------------------------------------


def _duty(table: Table, density: float | None) -> dict[str, Any]:
    """The duty's share of a case: gradient or flow rate, length, accuracy."""
    table.check_keys([], ["pressure_gradient", "flow_rate", "pressure_drop", "length", "accuracy"], "a duty")
    given = [key for key in ("pressure_gradient", "flow_rate", "pressure_drop") if key in table]
    if len(given) != 1:
        found = f"found {listed(given)}" if given else "found none of them"
        raise table.error(f"give one of pressure_gradient, flow_rate, or pressure_drop with length; {found}")
    gradient = flow_rate = None
    if "pressure_gradient" in table:
        gradient = table.quantity("pressure_gradient", "pressure gradient")
    elif "flow_rate" in table:
        flow_rate = _flow_rate(table, density)
    length = table.quantity("length", "length") if "length" in table else None
    if "pressure_drop" in table:
        if length is None:
            raise table.error(
                'a pressure drop needs the length it falls over, e.g. length = "2 m"', "pressure_drop"
            )
        gradient = table.quantity("pressure_drop", "pressure") / length
    return {
        "pressure_gradient": gradient,
        "flow_rate": flow_rate,
        "length": length,
        "accuracy": _accuracy(table),
    }


def _flow_rate(table: Table, density: float | None) -> float:
    """Volume flow [m3/s]; a mass flow is turned into one by the density."""
    if not units.measures(units.unit_of(table.values["flow_rate"]), "mass flow"):
        return table.quantity("flow_rate", "volume flow")
    mass_flow = table.quantity("flow_rate", "mass flow")
    return mass_flow / _needed(density, table, "flow_rate")


def _needed(density: float | None, table: Table, key: str) -> float:
    """The density, which a mass flow cannot do without."""
    if density is None:
        found = units.quoted(table.values[key])
        raise table.error(f'{found} is a mass flow: give density = "1200 kg/m^3" or the like in [fluid]', key)
    return density


def _accuracy(table: Table) -> float:
    """Accuracy asked for, or the usual one."""
    if "accuracy" not in table:
        table.note("accuracy", f"{DEFAULT_ACCURACY:.0%} (default)", DEFAULT_ACCURACY)
        return DEFAULT_ACCURACY
    value = units.parse_share(table.values["accuracy"], where=table.where("accuracy"))
    table.note("accuracy", str(table.values["accuracy"]), value)
    return value


def _report(table: Table, duty: Table, density: float | None) -> tuple[ReportUnit, ...]:
    """Units asked for in [report]; the duty's own unit where [report] is silent."""
    table.check_keys([], REPORTED, "a report")
    chosen = {key: units.unit_of(duty.values[key]) for key in REPORTED if key in duty}
    chosen.pop("length", None)
    found = [_report_unit(duty, key, unit, density) for key, unit in chosen.items() if key not in table]
    return tuple(found + [_report_unit(table, key, table.text(key), density) for key in table.values])


def _report_unit(table: Table, key: str, unit: str, density: float | None) -> ReportUnit:
    """One unit of the report, checked to measure what it should."""
    usual, *others = REPORTED[key]
    if any(units.measures(unit, other) for other in others):
        size = units.scale(unit, others[0]) / _needed(density, table, key)
    else:
        size = units.scale(unit, usual, where=table.where(key))
    return ReportUnit(key, unit, 1 / size)
