"""Time to a guaranteed accuracy, against a general-purpose finite-element library in the same run.

    python benchmarks/accuracy_and_time.py [WORDS OF A CASE'S NAME ...]

Each line: what ductsolve took for a bracket of +/- the accuracy asked, the true error of its best
estimate, and the least time in which scikit-fem came

- within the accuracy asked of the true flow rate, though it cannot know that itself: it guarantees nothing
- as close to the true flow rate as ductsolve's best estimate

The library solves on the same symmetric part and starts from the same first mesh, refined uniformly or also
towards walls or a re-entrant corner, with P1 or P2 triangles; its meshes are made before the clock starts,
and the best of all that are fine enough counts. "plain" has one sensible setting for all cases; "tuned" has
smoothing, its schedule and the coarser meshes to start from chosen in hindsight, case by case, as the
fastest that reach the error. ductsolve's time includes every level of refinement and the proof; its
settings are never touched. One thread; least of several runs.
"""

import single_thread  # noqa: F401

# isort: split

import itertools
import math
import statistics
import sys
from dataclasses import dataclass

import finite_elements as fe
from cases import Problem, all_problems
from stopwatch import best_time, milliseconds, print_row, timed

from ductsolve import Status

ACCURACIES = (1e-2, 1e-3, 1e-4)
REFERENCE_ACCURACY = 1e-5
KNOWN = 1 / 3  # of the accuracy asked: a wider bracket on the truth does not tell true errors
LEAST_ERROR = 1e-6  # the library's meshes are not refined beyond
TELLING = 2.0  # times the doubt in the truth: smaller true errors are not told apart
TOO_LONG = 1.0  # seconds: finer accuracies of a case are then not tried
LONGEST_LIBRARY_RUN = 0.6  # seconds: finer meshes are then not tried
SLOW_LIBRARY_RUN = 0.2  # seconds: fewer settings are then tried
MOST_TRIANGLES = {1: 70_000, 2: 25_000}
ALL = 99
# With less smoothing Newton's method on the velocity fails for yield stresses on fine meshes.
CAREFUL = fe.Setting(smoothing=1e-4, ratio=0.1, coarser=ALL)
SMOOTHINGS = (0.3, 0.1, 0.03, 0.01, 1e-3, 1e-4)
RATIOS = (0.0, 0.03, 0.1, 0.3)
COARSER = (0, 1, ALL)
TIGHT = 0.1  # part of the error wanted at which Newton's method stops
PLAIN_SMOOTHING = 0.1  # times the error wanted
CLEARLY_SLOWER = 3.0
FINALISTS = 2
WIDTHS = (36, 7, 10, 8, 7, 8, 19, 6, 9, 6, 9, 6, 14, 6, 14, 6)
HEADINGS = (
    *("case", "asked", "triangles", "steps", "error", "ms"),
    *("library's best mesh", "steps", "tuned ms", "ratio", "plain ms", "ratio"),
    *("same err tuned", "ratio", "same err plain", "ratio"),
)


@dataclass(frozen=True)
class Best:
    """The library's fastest way to one error.

    Attributes
    ----------
    mesh : in words
    steps : linear systems solved
    seconds : time
    """

    mesh: str
    steps: int
    seconds: float


class Opponent:
    """One kind of element on one family of meshes, for one problem."""

    def __init__(self, problem: Problem, true_flow: float, degree: int, family: str):
        section = problem.section
        self.problem, self.true_flow = problem, true_flow
        self.degree, self.family = degree, family
        # The nominal shear rate, taken from the answer.
        self.rate = 8 * true_flow / section.area / section.hydraulic_diameter
        self.grids, self.errors, self.seconds = [], [], []
        self._try_meshes(self._meshes(section.mesh()))

    def _meshes(self, first):
        if self.family == "uniform":
            return fe.uniform(first)
        corner = self.problem.corner
        return fe.graded(first, corner, extra=1 if corner is None else 3)

    def _try_meshes(self, meshes):
        """Errors on ever finer meshes, each solved with care."""
        for mesh, prolongation in meshes:
            if len(mesh.triangles) > MOST_TRIANGLES[self.degree]:
                break
            self.grids.append(fe.grid(mesh, self.degree, prolongation))
            (error, _), seconds = timed(lambda: self.run(len(self.grids) - 1, CAREFUL, LEAST_ERROR / 10))
            self.errors.append(error)
            self.seconds.append(seconds)
            if seconds > LONGEST_LIBRARY_RUN or max(map(abs, self.errors[-2:])) < LEAST_ERROR:
                break

    def run(self, level: int, setting: fe.Setting, stop: float):
        """Relative error of the flow rate, and the steps."""
        p = self.problem
        flow, steps = fe.solve(self.grids[: level + 1], p.fluid, p.gradient, self.rate, setting, stop)
        return len(p.section.copies) * flow / self.true_flow - 1, steps

    def level(self, accuracy: float) -> int | None:
        """First mesh from which on all errors are that small: a lucky crossing does not count."""
        good = [abs(error) <= accuracy for error in self.errors]
        level = len(good) - next((k for k, g in enumerate(reversed(good)) if not g), len(good))
        return level if level < len(good) else None

    def tuned(self, accuracy: float) -> Best:
        """Fastest setting on the first mesh that is fine enough."""
        level = self.level(accuracy)
        trials = []
        for setting in self._settings(level, accuracy):
            (error, steps), seconds = timed(lambda s=setting: self.run(level, s, TIGHT * accuracy))
            if abs(error) <= accuracy:
                trials.append((seconds, steps, setting))
        trials = sorted(trials, key=lambda trial: trial[0])[:FINALISTS]
        seconds, steps = min(
            (best_time(lambda s=setting: self.run(level, s, TIGHT * accuracy), patience=0.2)[0], steps)
            for _, steps, setting in trials
        )
        return Best(f"P{self.degree} {self.family} {self.triangles(level)}", steps, seconds)

    def triangles(self, level: int) -> int:
        return self.grids[level].mesh.t.shape[1]

    def _settings(self, level, accuracy):
        """Careful first, then all with the largest smoothing that is small enough."""
        yield CAREFUL
        for smoothing in SMOOTHINGS:
            setting = fe.Setting(smoothing, 0.1, ALL)
            if abs(self.run(level, setting, TIGHT * accuracy)[0]) <= accuracy:
                break
        slow = self.seconds[level] > SLOW_LIBRARY_RUN
        for ratio, coarser in itertools.product(RATIOS[2:] if slow else RATIOS, (ALL,) if slow else COARSER):
            yield fe.Setting(smoothing, ratio, coarser)

    def plain(self, accuracy: float) -> float:
        """Time [s] with the sensible setting, on the first mesh fine enough; infinite if there is none."""
        setting = fe.Setting(PLAIN_SMOOTHING * accuracy, 0.1, ALL)
        for level in range(self.level(accuracy), len(self.grids)):
            if abs(self.run(level, setting, TIGHT * accuracy)[0]) <= accuracy:
                return best_time(lambda k=level: self.run(k, setting, TIGHT * accuracy), patience=0.2)[0]
        return math.inf


def able(opponents: list[Opponent], error: float) -> list[Opponent]:
    """Those that reach the error, less the ones that are clearly slower with the careful setting."""
    reaching = [(o.seconds[o.level(error)], o) for o in opponents if o.level(error) is not None]
    least = min((seconds for seconds, _ in reaching), default=0.0)
    return [o for seconds, o in reaching if seconds <= CLEARLY_SLOWER * least]


def tuned_best(opponents: list[Opponent], error: float) -> Best | None:
    """The fastest tuned way to the error; None if none reaches it."""
    return min((o.tuned(error) for o in able(opponents, error)), key=lambda best: best.seconds, default=None)


def plain_best(opponents: list[Opponent], error: float) -> float:
    """Least plain time to the error [s]; infinite if none reaches it."""
    return min((o.plain(error) for o in able(opponents, error)), default=math.inf)


def compare(problem: Problem):
    """Print the lines of one problem; yields four ratios of times: to the accuracy asked tuned and plain,
    to the same true error tuned and plain.

    A line not tried, or a truth not known well enough to tell true errors, gives NaN.
    """
    reference = problem.solve(REFERENCE_ACCURACY)
    true_flow, within = reference.flow_rate, reference.history[-1].half_width
    opponents = [
        Opponent(problem, true_flow, degree, family) for degree in (1, 2) for family in ("uniform", "graded")
    ]
    seconds = 0.0
    for accuracy in ACCURACIES:
        label = (problem.name, f"{100 * accuracy:g} %")
        if seconds > TOO_LONG:
            print_row((*label, *"---", f"> {milliseconds(seconds)}", *"-" * 10), WIDTHS)
            yield [math.nan] * 4
            continue
        seconds, flow = best_time(lambda a=accuracy: problem.solve(a))
        error = abs(flow.flow_rate / true_flow - 1)
        best, plain = tuned_best(opponents, accuracy), plain_best(opponents, accuracy)
        known = within <= KNOWN * accuracy
        same, same_plain = None, math.inf
        if known:
            reached_error = max(error, TELLING * within)
            same, same_plain = tuned_best(opponents, reached_error), plain_best(opponents, reached_error)
        times = [best.seconds if best else math.inf, plain, same.seconds if same else math.inf, same_plain]
        columns = [cell for t in times for cell in _time_and_ratio(t, seconds)]
        mesh = (best.mesh, best.steps) if best else ("not reached", "-")
        print_row((*label, *_own(flow, error, seconds), *mesh, *columns), WIDTHS)
        reached = flow.status is Status.ANSWERED
        ratios = [(seconds if reached else math.inf) / t if math.isfinite(t) else 0.0 for t in times]
        yield [*ratios[:2], *(ratio if known and reached else math.nan for ratio in ratios[2:])]
    print(f"   truth known to {within:.0e}, by estimate to {reference.estimated_error:.0e}")


def _own(flow, error, seconds):
    history = flow.history
    steps = f"{sum(h.stress_steps for h in history)}+{sum(h.velocity_steps for h in history)}"
    mark = "" if flow.status is Status.ANSWERED else "*"
    return history[-1].triangles, steps, f"{error:.0e}", milliseconds(seconds) + mark


def _time_and_ratio(library, own):
    return (milliseconds(library), f"{own / library:.2f}") if math.isfinite(library) else ("-", "-")


def main():
    words = " ".join(sys.argv[1:])
    print("steps: linear systems solved, on all levels together (stress + velocity for ductsolve)")
    print("error: true relative error of the best estimate; ratio: ductsolve's time over the library's")
    print("*: accuracy not reached within the triangle budget; -: not tried or not reached")
    print_row(HEADINGS, WIDTHS)
    ratios = [four for problem in all_problems() if words in problem.name for four in compare(problem)]
    goals = ("to the accuracy asked", "to the same true error")
    names = [f"{setting}, {goal}" for goal in goals for setting in ("tuned", "plain")]
    for name, column in zip(names, zip(*ratios, strict=True), strict=False):
        print(f"library {name}: {summary(column)}")


def summary(column) -> str:
    """One line on ratios: 0 where only ductsolve got there, infinite where only the library did."""
    compared = [ratio for ratio in column if not math.isnan(ratio)]
    if not compared:
        return "nothing to compare"
    slower, never = sum(ratio > 1 for ratio in compared), sum(map(math.isinf, compared))
    largest = max((ratio for ratio in compared if math.isfinite(ratio)), default=math.nan)
    return (
        f"{len(compared)} lines compared, {len(column) - len(compared)} not; ductsolve slower in {slower}, "
        f"{never} of them not reached; median ratio {statistics.median(compared):.2f}, largest {largest:.2f}"
    )


if __name__ == "__main__":
    main()
