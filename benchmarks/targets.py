"""The times ductsolve is meant to keep, each beside what was measured.

    python benchmarks/targets.py

On one core; least of several runs, files in the disk cache. A case takes part in the cold-process target
with all of start-up, reading, solving and writing, pictures left out; the slowest case counts.
"""

import single_thread  # noqa: F401

# isort: split

import subprocess
import sys
import tempfile
from pathlib import Path

from cases import NARROW_ANNULUS, SLOT, SQUARE_THIN, Problem, drilling_annulus
from stopwatch import best_time, print_row

from ductsolve import Status

GEOMETRIES = Path(__file__).resolve().parent.parent / "geometries"
SLENDER_ACCURACIES = (1e-2, 1e-3, 1e-4)
COLD_RUNS = 3
WIDTHS = (60, 10, 10, 14)


def solve_time(problem: Problem, accuracy: float) -> float:
    """Least time [s] to the accuracy; infinite if it is not reached."""
    seconds, flow = best_time(lambda: problem.solve(accuracy), patience=2.0)
    return seconds if flow.status is Status.ANSWERED else float("inf")


def process_time(*arguments: str) -> float:
    """Least time [s] of a fresh ``ductsolve`` process."""

    def run():
        command = [sys.executable, "-m", "ductsolve", *arguments]
        subprocess.run(command, check=True, stdout=subprocess.DEVNULL)

    return best_time(run, runs=COLD_RUNS, patience=60.0)[0]


def slowest_case() -> tuple[str, float]:
    """Case file that takes longest in a fresh process, and its time [s]."""
    times = {}
    for case in sorted(GEOMETRIES.glob("*.toml")):
        with tempfile.TemporaryDirectory() as folder:
            times[case.name] = process_time("solve", str(case), "--no-pictures", "--out", folder)
    return max(times.items(), key=lambda item: item[1])


def measured():
    """Rows (what, target, measured), times in seconds or both ratios."""
    square = {accuracy: solve_time(SQUARE_THIN, accuracy) for accuracy in SLENDER_ACCURACIES}
    yield "square, n = 0.5, to +/- 0.1 %", 0.03, square[1e-3], "s"
    yield "square, n = 0.5, to +/- 0.01 %", 0.1, square[1e-4], "s"
    yield "eccentric annulus, HB, 1/3 of limit, to +/- 0.5 %", 0.5, solve_time(drilling_annulus(), 5e-3), "s"
    for problem in (SLOT, NARROW_ANNULUS):
        for accuracy in SLENDER_ACCURACIES:
            ratio = solve_time(problem, accuracy) / square[accuracy]
            yield f"{problem.name}, to +/- {100 * accuracy:g} %, over the square", 10.0, ratio, ""
    case, seconds = slowest_case()
    yield f"cold process, slowest case ({case})", 2.0, seconds, "s"
    yield "--help", 0.3, process_time("--help"), "s"


def main():
    print_row(("what", "target", "measured", "of the target"), WIDTHS)
    missed = 0
    for what, target, value, unit in measured():
        missed += value > target
        cells = (f"{target:g} {unit}", f"{value:.3g} {unit}", f"{value / target:.2f}")
        print_row((what, *cells), WIDTHS)
    print(f"{missed} missed" if missed else "all kept")


if __name__ == "__main__":
    main()
