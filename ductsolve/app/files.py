"""Result files: the numbers as JSON, the wall shear as CSV, the fields as VTU."""

from __future__ import annotations

import csv
import io
import json
import math
from pathlib import Path
from typing import Any

import meshio
import numpy as np

from ductsolve import __version__
from ductsolve.app.job import Outcome
from ductsolve.app.reading import LIMITS, REYNOLDS
from ductsolve.post.along_wall import distance_along, wall_loops
from ductsolve.post.shear import nodal_shear_stress
from ductsolve.rheology.tabulated import FlowCurve
from ductsolve.solver.flow import DuctFlow

WALL_COLUMNS = ("x [m]", "y [m]", "length [m]", "stress [Pa]", "distance along wall [m]", "loop", "wall")


def result(outcome: Outcome) -> dict[str, Any]:
    """Everything a job came to, in SI units; numbers without bound are None."""
    flow, case = outcome.flow, outcome.case
    content = {
        "ductsolve": __version__,
        "units": "SI",
        "title": case.title,
        "case_file": case.path.name,
        "status": flow.status.name.lower(),
        "status_text": flow.status.value,
        "flow_rate": flow.flow_rate,
        "flow_rate_bracket": flow.flow_rate_bracket,
        "pressure_gradient": flow.pressure_gradient,
        "pressure_gradient_bracket": flow.pressure_gradient_bracket,
        "accuracy_asked": case.accuracy,
        "accuracy_guaranteed": outcome.half_width,
        "estimated_error": flow.estimated_error,
        **_drop(outcome),
        "mean_velocity": flow.mean_velocity,
        "max_velocity": outcome.flow.max_velocity,
        "wall_shear": _wall(flow),
        "plug": _plug(flow),
        "reynolds": _reynolds(outcome),
        "section": _section(flow),
        "fluid": _fluid(flow, case.density),
        "triangles": len(flow.mesh.triangles),
        "seconds": outcome.seconds,
        "history": [_level(record) for record in flow.history],
        "warnings": outcome.warnings,
        "inputs": [item._asdict() for item in case.inputs],
    }
    return _plain(content)


def result_json(outcome: Outcome) -> str:
    """``result`` as text; strict JSON, without literals for what is not a finite number."""
    return json.dumps(result(outcome), indent=2, allow_nan=False, ensure_ascii=False) + "\n"


def _plain(value: Any) -> Any:
    """Value in the types of JSON."""
    if isinstance(value, dict):
        return {key: _plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple | np.ndarray):
        return [_plain(item) for item in value]
    if isinstance(value, float | np.floating):
        return float(value) if math.isfinite(value) else None
    return int(value) if isinstance(value, np.integer) else value


def _drop(outcome):
    length = outcome.case.length
    if length is None:
        return {"length": None, "pressure_drop": None, "pressure_drop_bracket": None}
    flow = outcome.flow
    return {
        "length": length,
        "pressure_drop": flow.pressure_gradient * length,
        "pressure_drop_bracket": [end * length for end in flow.pressure_gradient_bracket],
    }


def _wall(flow):
    wall = flow.wall_shear
    (smallest, smallest_at), (largest, largest_at) = wall.smallest, wall.largest_away
    unbounded = bool(len(wall.corners))
    if flow.flow_rate <= 0:
        return {"min": None, "mean": wall.mean, "max": None, "why_not": "not determined while nothing flows"}
    return {
        "min": smallest,
        "min_position": smallest_at,
        "mean": wall.mean,
        "max": None if unbounded else largest,
        "max_position": None if unbounded else largest_at,
        "unbounded": unbounded,
        "reentrant_corners": wall.corners,
        "max_away_from_corners": largest,
        "max_away_from_corners_position": largest_at,
    }


def _plug(flow):
    if flow.fluid.yield_stress == 0:
        return None
    return {
        "apparent_fraction": flow.plug.apparent,
        "proved_fraction": flow.plug.proved,
        "proved_below_shear_rate": flow.plug.slow_rate,
    }


def _reynolds(outcome):
    found = outcome.regime
    if found is None:
        why = "no density given" if outcome.case.density is None else "nothing flows"
        return {"generalised": None, "friction": None, "why_not": why}
    generalised, friction, limits = REYNOLDS
    law = found.law and {
        "index": found.law.index,
        "consistency": found.law.consistency,
        "tangent": not found.law.whole_curve,
    }
    return {
        "generalised": found.generalised,
        "generalised_definition": f"{generalised} Kozicki, Chou and Tiu 1966.",
        "friction": found.friction,
        "friction_definition": friction,
        "power_law": law,
        "shape_factors": {"a": found.factors.a, "b": found.factors.b},
        "laminar_limits": {LIMITS[rule]: limit for rule, limit in found.limits.items()},
        "laminar_limits_definition": limits,
        "outlook": found.outlook.value,
    }


def _section(flow):
    section = flow.section
    return {
        "name": section.name,
        "dimensions": section.dimensions,
        "area": section.area,
        "perimeter": section.perimeter,
        "hydraulic_diameter": section.hydraulic_diameter,
    }


def _fluid(flow, density):
    law = flow.fluid
    content = {"law": law.law_name, "density": density}
    if isinstance(law, FlowCurve):
        points = {"shear_rate": law.shear_rate, "shear_stress": law.shear_stress}
        return {**content, "number_of_points": len(law.shear_rate), "points": points}
    return {**content, "parameters": {label: value for label, value, _ in law.describe()}}


def _level(record):
    return {
        "triangles_solved": record.triangles,
        "stress_steps": record.stress_steps,
        "velocity_steps": record.velocity_steps,
        "relative_gap": record.gap,
        "half_width": record.half_width,
    }


def wall_shear_csv(flow: DuctFlow) -> str:
    """Wall shear map as CSV: loop by loop, a line for each piece of wall in the order of the walk."""
    wall = flow.wall_shear
    rows = np.concatenate([loop.rows for loop in wall_loops(wall)])
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(WALL_COLUMNS)
    columns = zip(
        *wall.position[rows].T.tolist(),
        wall.length[rows].tolist(),
        wall.stress[rows].tolist(),
        distance_along(wall)[rows].tolist(),
        wall.loop[rows].tolist(),
        (wall.names[index] for index in wall.wall[rows]),
        strict=True,
    )
    writer.writerows(columns)
    return text.getvalue()


def write_field(flow: DuctFlow, path: Path) -> None:
    """Write velocity, shear stress and shear rate at the points of the whole section as a VTU file."""
    mesh = flow.mesh
    stress = nodal_shear_stress(flow)
    meshio.Mesh(
        points=np.column_stack([mesh.points, np.zeros(len(mesh.points))]),
        cells=[("triangle6", mesh.triangles)],
        point_data={
            "axial velocity [m/s]": flow.velocity,
            "shear stress [Pa]": stress,
            "shear rate [1/s]": np.asarray(flow.fluid.rate(stress)),
        },
    ).write(path, file_format="vtu")
