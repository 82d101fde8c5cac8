"""Times of repeated runs, and plain tables."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence

MOST_RUNS = 25
PATIENCE = 1.0  # seconds after which no further run is made


def best_time(run: Callable[[], object], runs: int = MOST_RUNS, patience: float = PATIENCE):
    """Least time [s] of several runs after one to warm up, and what the last returned.

    A warm-up run that takes longer than ``patience`` counts as the only one.
    """
    result, best = timed(run)
    if best > patience:
        return best, result
    best, spent = float("inf"), 0.0
    for _ in range(runs):
        result, elapsed = timed(run)
        best, spent = min(best, elapsed), spent + elapsed
        if spent > patience:
            break
    return best, result


def timed(run: Callable[[], object]):
    """What a run returns and how long it took [s]."""
    start = time.perf_counter()
    result = run()
    return result, time.perf_counter() - start


def print_row(cells: Sequence[object], widths: Sequence[int]):
    """One line: the first cell to the left, the others to the right of their columns."""
    first, *rest = (str(cell) for cell in cells)
    print(first.ljust(widths[0]), *(c.rjust(w) for c, w in zip(rest, widths[1:], strict=True)), flush=True)


def milliseconds(seconds: float) -> str:
    return f"{1e3 * seconds:.1f}"
