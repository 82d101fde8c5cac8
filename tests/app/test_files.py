"""Result files: numbers that agree with the answer, in forms that others can read."""

import csv
import io
import json
import math

import meshio
import numpy as np
import pytest
from jobs import write_case

from ductsolve.app import files, job
from ductsolve.solver.quadratic import Elements, gauss


@pytest.fixture(scope="module")
def outcomes(tmp_path_factory):
    folder = tmp_path_factory.mktemp("cases")
    return lambda name, cache={}: cache.setdefault(name, job.run(write_case(folder, name)))


def refuse(literal):
    raise AssertionError(f"{literal} is no JSON")


@pytest.mark.parametrize("name", ["channel", "ring", "stuck", "angle", "fast"])
def test_json_is_strict(outcomes, name):
    text = files.result_json(outcomes(name))
    result = json.loads(text, parse_constant=refuse)
    assert result["units"] == "SI" and result["ductsolve"]
    assert len(result["history"]) == len(outcomes(name).flow.history)


def test_json_holds_the_answer(outcomes):
    outcome = outcomes("ring")
    flow, result = outcome.flow, json.loads(files.result_json(outcome))
    assert result["pressure_gradient"] == flow.pressure_gradient
    assert result["pressure_gradient_bracket"] == list(flow.pressure_gradient_bracket)
    assert result["flow_rate_bracket"] == [flow.flow_rate] * 2
    assert result["pressure_drop_bracket"] == list(flow.pressure_gradient_bracket)  # over 1 m
    assert result["max_velocity"] >= flow.max_velocity
    low, high = flow.pressure_gradient_bracket
    assert result["accuracy_guaranteed"] == pytest.approx((high - low) / (high + low))
    assert result["inputs"][0] == {"label": "section shape", "text": "annulus", "value": None, "unit": ""}
    assert result["reynolds"]["why_not"] == "no density given"


def test_json_holds_the_points_of_a_flow_curve(outcomes):
    fluid = json.loads(files.result_json(outcomes("fast")))["fluid"]
    assert fluid["points"] == {"shear_rate": [1, 3, 10], "shear_stress": [0.01, 0.03, 0.1]}
    assert fluid["number_of_points"] == 3 and isinstance(fluid["number_of_points"], int)


def test_json_says_unbounded(outcomes):
    wall = json.loads(files.result_json(outcomes("angle")))["wall_shear"]
    assert wall["max"] is None and wall["unbounded"] is True
    assert wall["reentrant_corners"] == [pytest.approx([0.005, 0.005])]
    assert 0 < wall["min"] < wall["mean"] < wall["max_away_from_corners"]


def test_json_of_a_bracket_without_an_upper_end():
    assert files._plain({"bracket": (0.0, math.inf), "error": np.float64("nan")}) == {
        "bracket": [0.0, None],
        "error": None,
    }


def test_reynolds_numbers_come_with_their_definitions(outcomes):
    reynolds = json.loads(files.result_json(outcomes("channel")))["reynolds"]
    assert reynolds["generalised"] == pytest.approx(reynolds["friction"], rel=0.1)
    assert "8^(n-1) K (b + a/n)^n" in reynolds["generalised_definition"]
    assert reynolds["friction_definition"].startswith("By friction: 8 rho U^2 / mean wall shear stress")
    assert len(reynolds["laminar_limits"]) == 3


@pytest.mark.parametrize("name", ["channel", "ring", "angle"])
def test_csv_balances_the_pressure(outcomes, name):
    flow = outcomes(name).flow
    lines = list(csv.DictReader(io.StringIO(files.wall_shear_csv(flow))))
    stress, length, distance = (
        np.array([float(line[column]) for line in lines])
        for column in ("stress [Pa]", "length [m]", "distance along wall [m]")
    )
    assert stress @ length == pytest.approx(flow.pressure_gradient * flow.section.area, rel=1e-9)
    assert length.sum() == pytest.approx(flow.section.perimeter, rel=1e-4)
    loop = np.array([int(line["loop"]) for line in lines])
    starts = np.flatnonzero(np.diff(loop, prepend=-1))
    assert loop[starts].tolist() == sorted(set(loop))  # each loop once
    assert distance[starts] == pytest.approx(length[starts] / 2)
    assert ((np.diff(distance) > 0) == (np.diff(loop) == 0)).all()
    assert 0 < distance.min() and distance.max() < flow.section.perimeter
    assert {line["wall"] for line in lines} <= set(flow.wall_shear.names)


@pytest.mark.parametrize("name", ["channel", "ring"])
def test_field_survives_a_round_trip(outcomes, name, tmp_path):
    flow = outcomes(name).flow
    files.write_field(flow, tmp_path / "field.vtu")
    read = meshio.read(tmp_path / "field.vtu")
    assert read.points == pytest.approx(np.column_stack([flow.mesh.points, 0 * flow.mesh.points[:, 0]]))
    assert [block.type for block in read.cells] == ["triangle6"]
    assert (read.cells[0].data == flow.mesh.triangles).all()
    assert set(read.point_data) == {"axial velocity [m/s]", "shear stress [Pa]", "shear rate [1/s]"}
    velocity = read.point_data["axial velocity [m/s]"][flow.mesh.triangles]
    elements = Elements(flow.mesh, gauss(4))
    flow_rate = elements.integral(elements.value(velocity)).sum()
    assert flow_rate == pytest.approx(flow.flow_rate, rel=1e-6)


def test_field_of_a_plug_has_no_rate_in_it(outcomes, tmp_path):
    flow = outcomes("channel").flow
    files.write_field(flow, tmp_path / "field.vtu")
    read = meshio.read(tmp_path / "field.vtu").point_data
    still = read["shear stress [Pa]"] <= flow.fluid.yield_stress
    assert still.any() and (read["shear rate [1/s]"][still] == 0).all()
    assert (read["shear rate [1/s]"][~still] > 0).all()
