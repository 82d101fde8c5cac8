"""One job: a case file solved, with everything a report of it needs."""

from __future__ import annotations

import time
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path

from ductsolve.app.case import Case, read_case
from ductsolve.app.schema import Input
from ductsolve.app.units import parse_share
from ductsolve.errors import DuctsolveWarning
from ductsolve.post.regime import Outlook, Regime, regime
from ductsolve.solver.duty import half_width
from ductsolve.solver.flow import DuctFlow, LevelRecord, Status
from ductsolve.solver.solve import TRIANGLE_BUDGET, solve

SETTLED = (Status.ANSWERED, Status.NO_FLOW)


@dataclass(frozen=True, eq=False)
class Outcome:
    """A case and what came of it.

    Attributes
    ----------
    case : as read, with what the command line overrode
    flow : the answer
    regime : Reynolds numbers, None without a density or where nothing flows
    seconds : it took to solve
    warnings : what the user should know, a sentence each
    """

    case: Case
    flow: DuctFlow
    regime: Regime | None
    seconds: float
    warnings: tuple[str, ...]

    @property
    def settled(self) -> bool:
        """Whether the answer has the accuracy that was asked, or no flow is proved."""
        return self.flow.status in SETTLED

    @property
    def moves(self) -> bool:
        """Whether anything flows, as far as the best estimate tells."""
        return self.flow.flow_rate > 0

    @property
    def gradient_wanted(self) -> bool:
        """Whether the pressure gradient is the answer, the flow rate being given."""
        return self.case.flow_rate is not None

    @property
    def half_width(self) -> float | None:
        """Relative half-width of the guaranteed bracket on the answer, None where it has no upper end."""
        flow = self.flow
        return half_width(flow.pressure_gradient_bracket if self.gradient_wanted else flow.flow_rate_bracket)


def run(
    path: str | Path,
    accuracy: str | None = None,
    method: str = "newton",
    triangles: int | None = None,
    progress: Callable[[LevelRecord, float], None] | None = None,
) -> Outcome:
    """Read and solve a case.

    ``accuracy`` is text from the command line that overrides the case's, ``triangles`` the budget of
    triangles if not the usual one; ``progress`` is called with the record of every level and the accuracy.
    """
    notes: list[str] = []
    with _noted(notes):
        case = read_case(path)
        if accuracy is not None:
            case = _with_accuracy(case, accuracy)
        start = time.perf_counter()
        flow = solve(
            case.section,
            case.fluid,
            pressure_gradient=case.pressure_gradient,
            flow_rate=case.flow_rate,
            accuracy=case.accuracy,
            method=method,
            triangle_budget=triangles or TRIANGLE_BUDGET,
            progress=progress and (lambda record: progress(record, case.accuracy)),
        )
        seconds = time.perf_counter() - start
        moving = case.density is not None and flow.flow_rate > 0
        outlook = regime(flow, case.density) if moving else None
    return Outcome(
        case=case,
        flow=flow,
        regime=outlook,
        seconds=seconds,
        warnings=tuple(dict.fromkeys([*notes, *_findings(flow, outlook)])),
    )


def _with_accuracy(case: Case, text: str) -> Case:
    """The case with another accuracy, and its echo saying where that came from."""
    try:
        given: object = float(text)
    except ValueError:
        given = text
    accuracy = parse_share(given, where="--accuracy")
    echo = Input("duty accuracy", f"{text} (command line)", accuracy)
    inputs = tuple(echo if item.label == echo.label else item for item in case.inputs)
    return replace(case, accuracy=accuracy, inputs=inputs)


def _findings(flow: DuctFlow, outlook: Regime | None) -> Iterator[str]:
    """What the answer itself gives cause to warn of."""
    if outlook is not None and outlook.outlook is not Outlook.LAMINAR:
        yield f"{outlook.outlook.value}: every number here supposes that it is laminar"


@contextmanager
def _noted(notes: list[str]) -> Iterator[None]:
    """Collect the library's warnings as sentences; let all others go their usual way."""
    with warnings.catch_warnings(record=True) as caught:
        warnings.simplefilter("always", DuctsolveWarning)
        yield
    for item in caught:
        if issubclass(item.category, DuctsolveWarning):
            notes.append(str(item.message))
        else:
            warnings.warn_explicit(item.message, item.category, item.filename, item.lineno)
