"""Where the time goes as meshes grow, and whether compiled loops would pay.

    python benchmarks/scale.py

First table: microseconds per triangle of every stage of one level, on uniform meshes. Second: the three most
used array expressions against the same loops compiled by numba (``kernels.py``), and what numba's import
and first calls cost a fresh process. One thread; least of several runs.
"""

import single_thread  # noqa: F401

# isort: split

import os
import subprocess
import sys
import tempfile
from dataclasses import dataclass

import kernels
import numpy as np
from cases import SQUARE_THIN, Problem, drilling_annulus
from numba import njit
from stopwatch import best_time, print_row

from ductsolve import HerschelBulkley
from ductsolve.mesh.bisect import bisect
from ductsolve.solver.bracket import potential_bracket
from ductsolve.solver.fields import Level
from ductsolve.solver.levels import dominant, first_level, relax
from ductsolve.solver.newton import tensor
from ductsolve.solver.quadratic import Elements, interior
from ductsolve.solver.rate import response, tilted_bracket
from ductsolve.solver.system import System

LEAST_TRIANGLES, MOST_TRIANGLES = 400, 60_000
GOAL = 1e-4  # relative gap the fields are relaxed for
WARM_GOAL = 1e-5  # ... and relaxed once more from there, as on the next level
WIDTHS = (36, 10, 10, 10, 10, 10)
KERNEL_SIZES = (32, 100, 500, 2_000, 10_000, 50_000)


@dataclass(frozen=True, eq=False)
class Scene:
    """One level with relaxed fields and the arrays its stages work on."""

    problem: Problem
    level: Level
    psi: np.ndarray

    def stages(self):
        """Pairs (name, function) in the order of a level."""
        problem, level = self.problem, self.level
        fluid, gradient = problem.fluid, problem.gradient
        iterate = relax(level, fluid, gradient, self.psi, GOAL)
        elements, capped = level.elements, iterate.capped
        stress = gradient * level.stress(iterate.psi)
        size = np.hypot(*stress)
        secant, tangent = capped.linearised(size)
        moduli = tensor(1 / tangent, 1 / secant, stress / size)
        stiffness = elements.stiffness(moduli)
        system, load = level.velocity_system, elements.unit_load
        solve = system.factor(stiffness)
        everywhere = np.ones(elements.count, dtype=bool)
        velocity = iterate.velocity.local
        return [
            ("geometry at the points", lambda: Elements(level.mesh, interior())),
            ("pattern, stress", lambda: System(level.stress_system.unknown, level.cuts)),
            ("pattern, velocity", lambda: System(system.unknown)),
            ("fluidity, secant and tangent", lambda: capped.linearised(size)),
            ("energy at one trial step", lambda: elements.integral(capped.energy(size)).sum()),
            ("gradient", lambda: elements.gradient(velocity)),
            ("load of a vector field", lambda: elements.load(stress)),
            ("stiffness", lambda: elements.stiffness(moduli)),
            ("sum into the matrix and LU, velocity", lambda: system.factor(stiffness)),
            ("sum into the matrix and LU, stress", lambda: level.stress_system.factor(stiffness)),
            ("solve with the factors", lambda: system.spread(solve(load))),
            (
                "bracket on the potential",
                lambda: potential_bracket(level, fluid, gradient, iterate.psi, velocity),
            ),
            *([] if fluid.power_index else [("bracket on the flow rate", lambda: _flow_bracket(iterate))]),
            ("marking", lambda: dominant(iterate.bracket.gap)),
            ("both fields, from scratch", lambda: relax(level, fluid, gradient, self.psi, GOAL)),
            ("both fields, warm", lambda: relax(level, fluid, gradient, iterate.psi, WARM_GOAL)),
            ("bisection to four times the size", lambda: bisect(level.mesh, everywhere)),
        ]


def _flow_bracket(iterate):
    return tilted_bracket(iterate, response(iterate), GOAL)


def scenes(problem: Problem):
    """The problem on ever finer uniform meshes."""
    level, psi = first_level(problem.section), None
    while len(level.mesh.triangles) <= MOST_TRIANGLES:
        if len(level.mesh.triangles) >= LEAST_TRIANGLES:
            yield Scene(problem, level, psi)
        psi = relax(level, problem.fluid, problem.gradient, psi, GOAL).psi
        level, psi = level.refined(np.ones(len(level.mesh.triangles), dtype=bool), psi)


def print_stages(problem: Problem):
    """Microseconds per triangle of every stage on every mesh."""
    sizes, columns, names = [], [], []
    for scene in scenes(problem):
        count = len(scene.level.mesh.triangles)
        stages = scene.stages()
        names = [name for name, _ in stages]
        sizes.append(count)
        columns.append([1e6 * best_time(run, patience=0.4)[0] / count for _, run in stages])
    print(f"\n{problem.name}: microseconds per triangle")
    widths = WIDTHS[: len(sizes) + 1]
    print_row(("stage", *(f"{size} tri" for size in sizes)), widths)
    for name, times in zip(names, zip(*columns, strict=True), strict=True):
        print_row((name, *(f"{t:.2f}" for t in times)), widths)


def numpy_versions(count: int):
    """ductsolve's own expressions on a mesh of that many straight triangles, and the kernels' arguments."""
    level = first_level(SQUARE_THIN.section)
    chosen = np.arange(count) % len(level.mesh.triangles)
    elements = Elements(level.mesh, interior(), chosen)
    (b0, b1), (c0, c1) = elements._b, elements._c
    _, (*_, local, _), (stress, moved, step, *_) = kernels.examples(count)
    moduli = tuple(np.random.default_rng(1).uniform(1.0, 2.0, (3, count, 6)))
    fluid, slopes = HerschelBulkley(1.0, 0.5, 0.6), elements.rule.slopes

    def energy():
        trial = stress + step * moved
        size = np.sqrt(trial[0] ** 2 + trial[1] ** 2)
        return elements.integral(fluid.complementary(size)).sum()

    geometry = (b0, b1, c0, c1)
    of_energy = (elements.weights, fluid.yield_stress, fluid.consistency, fluid.index)
    return [
        ("stiffness", lambda: elements.stiffness(moduli), (*geometry, elements.weights, *moduli, slopes)),
        ("gradient", lambda: elements.gradient(local), (*geometry, local, slopes)),
        ("energy", energy, (stress, moved, step, *of_energy)),
    ]


def print_kernels():
    """Speed-up of the compiled loops, and their cost in a fresh process."""
    compiled = {name: njit(getattr(kernels, name)) for name in ("stiffness", "gradient", "energy")}
    rows = {name: [] for name in compiled}
    for count in KERNEL_SIZES:
        for name, by_numpy, arguments in numpy_versions(count):
            own, expected = best_time(by_numpy, patience=0.3)
            compiled[name](*arguments)  # the first call compiles
            loop, found = best_time(lambda n=name, a=arguments: compiled[n](*a), patience=0.3)
            np.testing.assert_allclose(found, expected, rtol=1e-9, atol=1e-12 * np.abs(expected).max())
            rows[name].append(f"{1e6 * own:.0f}/{1e6 * loop:.0f} {own / loop:.1f}x")
    print("\nnumpy / numba in microseconds, and the speed-up")
    widths = (12, *[18] * len(KERNEL_SIZES))
    print_row(("expression", *(f"{count} tri" for count in KERNEL_SIZES)), widths)
    for name, cells in rows.items():
        print_row((name, *cells), widths)
    with tempfile.TemporaryDirectory() as cache:
        for state in ("compiling", "from numba's cache"):
            imported, called = fresh_process(cache)
            print(f"fresh process, {state}: import numba {imported:.2f} s, first calls {called:.2f} s")


def fresh_process(cache: str) -> tuple[float, float]:
    """Seconds to import numba and to make the kernels' first calls."""
    environment = {**os.environ, "NUMBA_CACHE_DIR": cache}
    command = [sys.executable, kernels.__file__]
    printed = subprocess.run(command, env=environment, check=True, capture_output=True, text=True).stdout
    imported, called = map(float, printed.split())
    return imported, called


def main():
    for problem in (SQUARE_THIN, drilling_annulus()):
        print_stages(problem)
    print_kernels()


if __name__ == "__main__":
    main()
