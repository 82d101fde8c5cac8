"""What the terminal shows."""

import io
import re

import pytest
from jobs import write_case

from ductsolve.app import job, terminal
from ductsolve.solver.flow import LevelRecord


@pytest.fixture(scope="module")
def outcomes(tmp_path_factory):
    folder = tmp_path_factory.mktemp("cases")
    return lambda name, cache={}: cache.setdefault(name, job.run(write_case(folder, name)))


@pytest.fixture(scope="module")
def texts(outcomes):
    return lambda name: terminal.report_of(outcomes(name))


def cells(text, label, after=""):
    """Cells of the first row with a label, after a line that starts with some words."""
    lines = text[text.index(after) :].splitlines()
    line = next(line for line in lines if re.match(rf"\s+{re.escape(label)}(\s\s|$)", line))
    return re.split(r"\s{3,}", line.strip())[1:]


@pytest.mark.parametrize("name", ["channel", "ring", "slot", "stuck", "angle", "fast"])
def test_plain_text(texts, name):
    text = texts(name)
    assert text.isascii() and "\t" not in text and "\x1b" not in text
    assert max(map(len, text.splitlines())) <= 110
    assert not any(line != line.rstrip() for line in text.splitlines())
    assert "nan" not in text and "None" not in text and "inf " not in text


def test_columns_line_up(texts):
    lines = texts("channel").splitlines()
    starts = {line.index(value) for value in ("150 mm", "0.0089") for line in lines if value in line}
    assert len(starts) == 1


def test_inputs_as_given_and_in_si(texts):
    text = texts("channel")
    assert cells(text, "section width") == ["150 mm", "0.15 m"]
    assert cells(text, "fluid consistency") == ["0.9 Pa.s^n", "0.9 Pa.s^0.55"]
    assert cells(text, "duty accuracy") == ["1% (default)", "0.01"]
    assert text.index("fluid law") < text.index("fluid density")


def test_answer_with_its_bracket(outcomes, texts):
    flow, text = outcomes("channel").flow, texts("channel")
    low, high = (float(cells(text, label, "Answer")[0].split()[0]) for label in ("guaranteed between", "and"))
    assert low <= flow.flow_rate_bracket[0] <= flow.flow_rate <= flow.flow_rate_bracket[1] <= high
    assert high - low < 1.01 * (flow.flow_rate_bracket[1] - flow.flow_rate_bracket[0])
    assert cells(text, "best estimate", "Answer")[1].endswith("m3/h")
    assert cells(text, "estimated error")[0].endswith("% of the estimate, not guaranteed")
    assert cells(text, "pressure drop over 25 m") == ["15000 Pa", "15 kPa"]


def test_pressure_drop_has_the_bracket_of_the_gradient(outcomes, texts):
    gradient, drop = (
        [float(cells(texts("ring"), label, title)[0].split()[0]) for label in ("guaranteed between", "and")]
        for title in ("pressure gradient\n", "pressure drop over 1 m")
    )
    assert gradient == pytest.approx(drop, rel=1e-9)  # the duct is 1 m long
    assert cells(texts("ring"), "flow rate, given")[1] == "2 L/min"


def test_largest_stress_at_a_reentrant_corner_is_no_number(texts):
    text = texts("angle")
    assert cells(text, "largest", "Wall shear") == ["unbounded at the re-entrant corner (5, 5) mm"]
    assert cells(text, "largest away from them")[0].endswith("Pa")


def test_plug(outcomes, texts):
    assert cells(texts("channel"), "looks unyielded")[0].endswith("% of the area")
    assert "Plug" not in texts("ring")


def test_no_flow(texts):
    text = texts("stuck")
    assert cells(text, "outcome") == ["no flow, proved"]
    assert "stays at or below the yield stress" in text
    assert "estimate" not in text[text.index("Answer") : text.index("Wall shear")]
    assert "Velocity" not in text
    assert cells(text, "generalised, by friction") == ["0: nothing flows"]


def test_reynolds_numbers(texts):
    channel, ring, fast = texts("channel"), texts("ring"), texts("fast")
    assert cells(ring, "generalised, by friction") == ["not worked out: no density given"]
    assert cells(channel, "regime") == ["laminar flow is to be expected"]
    assert "tangent at the mean wall shear stress" in cells(channel, "power law in it")[1]
    assert cells(fast, "regime") == ["laminar flow is not to be expected"]


def test_warnings_come_first(texts):
    text = texts("fast")
    assert text.index("Warnings") < text.index("Inputs") < text.index("Answer")
    flat = " ".join(text.split())
    assert "every number here supposes that it is laminar" in flat
    assert "times above its last point" in flat
    assert "Warnings" not in texts("channel")


def test_cautions(texts):
    flat = " ".join(texts("channel").split())
    assert "check them against local codes, licensed practice" in flat
    assert "Guaranteed:" in flat and "Not guaranteed:" in flat


def test_an_answer_that_falls_short_says_so(tmp_path):
    outcome = job.run(write_case(tmp_path, "channel"), accuracy="0.01 %", triangles=100)
    assert not outcome.settled
    text = terminal.report_of(outcome)
    assert "Bracket true but wider than asked" in text[: text.index("Inputs")]
    assert cells(text, "half-width of that bracket")[0].endswith(" (asked +/- 0.01 %)")
    assert cells(text, "duty accuracy")[0] == "0.01 % (command line)"


# --- progress -----------------------------------------------------------------------------------------


class Screen(io.StringIO):
    def isatty(self):
        return True


def test_progress_rewrites_one_line_and_erases_it():
    screen = Screen()
    with terminal.progress_on(screen) as progress:
        progress(LevelRecord(12, 3, 2, 0.1, None), 0.01)
        progress(LevelRecord(48, 3, 2, 0.01, 0.0123), 0.01)
    frames = screen.getvalue().split("\r")
    assert "\n" not in screen.getvalue()
    assert frames[1] == "level 1, 12 triangles: gap 10 %, bracket to come"
    assert frames[2].strip() == "level 2, 48 triangles: +/- 1.23 % guaranteed, +/- 1 % asked"
    assert frames[-2].strip() == "" and len(frames[-2]) >= max(map(len, frames))
    assert frames[-1] == ""


def test_progress_is_silent_in_a_pipe():
    pipe = io.StringIO()
    with terminal.progress_on(pipe) as progress:
        assert progress is None
    assert pipe.getvalue() == ""
