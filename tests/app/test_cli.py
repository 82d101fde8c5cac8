"""The command, from what is typed to what is left behind."""

import io
import json
import subprocess
import sys
import time
from pathlib import Path

import pytest
from jobs import CASES, write_case

from ductsolve.app import cli, job, writing
from ductsolve.app.cli import main
from ductsolve.solver.solve import METHODS

GEOMETRIES = sorted((Path(__file__).parents[2] / "geometries").glob("*.toml"))
NUMERIC = {"numpy", "scipy", "numba", "pint", "meshio", "matplotlib"}


def files_in(folder):
    return {path.name: path.read_bytes() for path in folder.iterdir()}


def run(capsys, *arguments):
    """Exit code, output and error output of the command."""
    code = main([str(argument) for argument in arguments])
    return code, *capsys.readouterr()


# --- help ---------------------------------------------------------------------------------------------


def test_help_loads_nothing_numeric():
    code = (
        "import sys; from ductsolve.app.cli import main; code = main(['solve', '--help']);"
        "print(code, *sorted(name.split('.')[0] for name in sys.modules))"
    )
    result = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    code, *modules = result.stdout.splitlines()[-1].split()
    assert code == "0" and not NUMERIC & set(modules)


def test_help_answers_at_once():
    times = []
    for _ in range(5):  # the quickest: other work on the machine is not the command's
        start = time.perf_counter()
        subprocess.run([sys.executable, "-m", "ductsolve", "--help"], capture_output=True, check=True)
        times.append(time.perf_counter() - start)
    assert min(times) < 0.3


def test_help_names_what_the_solver_has(capsys):
    assert cli.METHODS == METHODS
    _, out, _ = run(capsys, "solve", "--help")
    assert "Exit code 0: answered" in out


# --- answers ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("case", GEOMETRIES, ids=lambda path: path.stem)
def test_every_case_in_geometries(case, tmp_path, capsys):
    code, out, err = run(capsys, "solve", case, "--out", tmp_path / "out", "--no-pictures")
    assert (code, err) == (0, "")
    assert set(files_in(tmp_path / "out")) == set(writing.NUMBERS)
    result = json.loads((tmp_path / "out" / "result.json").read_text(encoding="utf-8"))
    assert result["status"] == "answered"
    assert out.startswith(result["title"])
    for name in ("flow_rate", "pressure_gradient"):
        low, high = result[f"{name}_bracket"]
        assert 0 < low <= result[name] <= high


def test_without_a_folder_nothing_is_written(tmp_path, capsys, monkeypatch):
    case = write_case(tmp_path, "ring")
    monkeypatch.chdir(tmp_path)
    code, out, _ = run(capsys, "solve", case)
    assert code == 0 and "Files" not in out
    assert list(files_in(tmp_path)) == ["ring.toml"]


def test_all_files(tmp_path, capsys):
    code, out, _ = run(capsys, "solve", write_case(tmp_path, "channel"), "--out", tmp_path / "out")
    assert code == 0
    assert set(files_in(tmp_path / "out")) == set(writing.file_names())
    listed = " ".join(out[out.index("\nFiles") :].split())
    assert all(name in listed for name in writing.file_names())


def test_without_arguments_the_help_page(capsys):
    code, out, err = run(capsys)
    assert (code, out) == (2, "")
    assert "\nOptions:\n" in err and "\nCommands:\n" in err and "ductsolve: " not in err


def test_no_flow_is_an_answer(tmp_path, capsys):
    code, out, _ = run(capsys, "solve", write_case(tmp_path, "stuck"), "--out", tmp_path / "out")
    assert code == 0 and "no flow, proved" in out
    result = json.loads((tmp_path / "out" / "result.json").read_text())
    assert (result["status"], result["flow_rate"], result["flow_rate_bracket"]) == ("no_flow", 0, [0, 0])
    assert result["wall_shear"]["max"] is None


def test_short_of_the_accuracy(tmp_path, capsys):
    case = write_case(tmp_path, "channel")
    code, _, err = run(capsys, "solve", case, "--accuracy", "0.01 %", "--triangles", 60)
    assert code == 3
    assert err.startswith("ductsolve: Bracket true but wider than asked")


def test_accuracy_from_the_command_line(tmp_path, capsys):
    case = write_case(tmp_path, "ring")
    code, out, _ = run(capsys, "solve", case, "--accuracy", "0.0005")
    assert code == 0 and "asked +/- 0.05 %" in out and "0.0005 (command line)" in out


def test_both_methods_agree(tmp_path, capsys):
    brackets = []
    for method in METHODS:
        folder, case = tmp_path / method, write_case(tmp_path, "ring")
        code, *_ = run(capsys, "solve", case, "--method", method, "--out", folder, "--no-pictures")
        assert code == 0
        brackets.append(json.loads((folder / "result.json").read_text())["pressure_gradient_bracket"])
    (low, high), (other_low, other_high) = brackets
    assert max(low, other_low) <= min(high, other_high)


def test_warnings_are_lines_on_the_error_output(tmp_path, capsys):
    code, _, err = run(capsys, "solve", write_case(tmp_path, "fast"))
    assert code == 0
    assert len(err.splitlines()) == 2
    assert all(line.startswith("ductsolve: ") for line in err.splitlines())


def test_pictures_of_an_earlier_run_are_pointed_out(tmp_path, capsys):
    case, folder = write_case(tmp_path, "ring"), tmp_path / "out"
    folder.mkdir()
    (folder / "velocity.png").write_bytes(b"old")
    _, out, _ = run(capsys, "solve", case, "--out", folder, "--no-pictures")
    assert "Left there by an earlier run, and not of this answer: velocity.png" in out


def test_the_module_runs_as_the_command_does(tmp_path):
    case = write_case(tmp_path, "ring")
    result = subprocess.run(
        [sys.executable, "-m", "ductsolve", "solve", str(case)], capture_output=True, text=True
    )
    assert (result.returncode, result.stderr) == (0, "")
    assert result.stdout.startswith("Ring\n")


def test_a_terminal_without_the_letters(tmp_path, capsys, monkeypatch):
    case = tmp_path / "case.toml"
    case.write_text('title = "Brühe ≈ 5 °C"\n' + CASES["slot"], encoding="utf-8")
    stream = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    monkeypatch.setattr(sys, "stdout", stream)
    assert main(["solve", str(case)]) == 0
    stream.flush()
    assert stream.buffer.getvalue().startswith(b"Br?he ? 5 ?C")


# --- refusals -----------------------------------------------------------------------------------------

BAD = {
    "negative gap": ("slot", 'width = "1 mm"', 'width = "-1 mm"'),
    "inner larger than outer": ("ring", 'inner_diameter = "96 mm"', 'inner_diameter = "106 mm"'),
    "eccentricity above 1": ("ring", "eccentricity = 0.3", "eccentricity = 1.2"),
    "index 0": ("ring", "index = 0.5", "index = 0"),
    "index NaN": ("ring", "index = 0.5", "index = nan"),
    "unit missing": ("slot", 'width = "1 mm"', 'width = "1"'),
    "wrong dimension": ("slot", 'width = "1 mm"', 'width = "1 Pa"'),
    "both duties": ("slot", "[duty]", '[duty]\nflow_rate = "1 L/min"'),
    "no duty": ("slot", 'pressure_gradient = "1 bar/m"', ""),
    "accuracy too small": ("slot", "[duty]", "[duty]\naccuracy = 1e-12"),
    "unknown key": ("slot", "width =", "widht ="),
    "no such mesh": ("angle", "angle.vtu", "missing.vtu"),
    "not TOML": ("slot", "[section]", "[section"),
}


@pytest.mark.parametrize("fault", BAD)
def test_bad_input_is_one_line(fault, tmp_path, capsys):
    name, good, bad = BAD[fault]
    folder = tmp_path / "out"
    folder.mkdir()
    (folder / "result.json").write_text("old")
    case = write_case(tmp_path, name)
    text = case.read_text(encoding="utf-8")
    assert good in text
    case.write_text(text.replace(good, bad), encoding="utf-8")
    code, out, err = run(capsys, "solve", case, "--out", folder)
    assert (code, out) == (2, "")
    assert err.startswith("ductsolve: ") and len(err.splitlines()) == 1 and "Traceback" not in err
    assert files_in(folder) == {"result.json": b"old"}


@pytest.mark.parametrize(
    "content", [b"", b"\x00\x01\x02\xff", b"title = 1\n"], ids=["empty", "binary", "no tables"]
)
def test_what_is_no_case(content, tmp_path, capsys):
    case = tmp_path / "case.toml"
    case.write_bytes(content)
    code, out, err = run(capsys, "solve", case, "--out", tmp_path / "out")
    assert (code, out) == (2, "") and len(err.splitlines()) == 1
    assert not (tmp_path / "out").exists()


@pytest.mark.parametrize(
    "arguments",
    [
        ["solve"],
        ["solve", "missing.toml"],
        ["slove", "case.toml"],
        ["solve", "case.toml", "--method", "guess"],
        ["solve", "case.toml", "--triangles", "0"],
        ["solve", "case.toml", "--color"],
    ],
)
def test_bad_arguments_are_one_line(arguments, capsys):
    code, out, err = run(capsys, *arguments)
    assert (code, out) == (2, "")
    assert err.startswith("ductsolve: ") and len(err.splitlines()) == 1


@pytest.mark.parametrize("accuracy", ["0", "2", "nan", "fine", "1 mm", "-1 %"])
def test_bad_accuracy_is_one_line(accuracy, tmp_path, capsys):
    code, out, err = run(capsys, "solve", write_case(tmp_path, "slot"), f"--accuracy={accuracy}")
    assert (code, out) == (2, "")
    assert err.startswith("ductsolve: --accuracy: ") and len(err.splitlines()) == 1


def test_a_folder_that_cannot_be_is_refused_before_the_work(tmp_path, capsys, monkeypatch):
    monkeypatch.setattr(job, "run", lambda *_, **__: pytest.fail("worked for nothing"))
    (tmp_path / "file").write_text("mine")
    code, out, err = run(capsys, "solve", write_case(tmp_path, "slot"), "--out", tmp_path / "file")
    assert (code, out) == (2, "") and "is a file; give a folder" in err
    assert (tmp_path / "file").read_text() == "mine"


def test_failing_to_write_leaves_nothing_half_done(tmp_path, capsys, monkeypatch):
    def full(*_):
        raise OSError(28, "No space left on device")

    folder = tmp_path / "out"
    folder.mkdir()
    (folder / "result.json").write_text("old")
    monkeypatch.setattr(writing, "write_field", full)
    case = write_case(tmp_path, "ring")
    code, out, err = run(capsys, "solve", case, "--out", folder, "--no-pictures")
    assert (code, out) == (2, "") and "No space left" in err and len(err.splitlines()) == 1
    assert files_in(folder) == {"result.json": b"old"}


def test_stopping_by_the_keyboard(tmp_path, capsys, monkeypatch):
    def stop(*_, **__):
        raise KeyboardInterrupt

    monkeypatch.setattr(job, "solve", stop)
    code, out, err = run(capsys, "solve", write_case(tmp_path, "slot"), "--out", tmp_path / "out")
    assert (code, out, err.strip()) == (130, "", "ductsolve: stopped; nothing was written")
    assert not (tmp_path / "out").exists()


def test_a_reader_that_leaves(tmp_path):
    case = write_case(tmp_path, "ring")
    command = f'"{sys.executable}" -m ductsolve solve "{case}" | head -c 1'
    result = subprocess.run(command, shell=True, capture_output=True, text=True)
    assert result.stderr == ""


def test_an_empty_out_is_refused(capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    case = Path(__file__).parents[2] / "geometries" / "concentric_annulus.toml"
    assert main(["solve", str(case), "--out", ""]) == 2
    assert "--out is empty" in capsys.readouterr().err
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("closed", [">&-", "2>&-"])
def test_closed_output_is_no_crash(closed):
    case = Path(__file__).parents[2] / "geometries" / "concentric_annulus.toml"
    line = f'"{sys.executable}" -m ductsolve solve "{case}" {closed}'
    done = subprocess.run(["sh", "-c", line], capture_output=True, text=True)
    assert done.returncode == 0
    assert "Traceback" not in done.stderr
