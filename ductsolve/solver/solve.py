"""The one verb: a section, a fluid and a duty in, a duct flow with its bracket out."""

from __future__ import annotations

import warnings
from collections.abc import Callable

import numpy as np

from ductsolve.errors import DuctsolveWarning, DutyError, FluidError, SectionError, is_finite_number
from ductsolve.mesh.sections import Section
from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.duty import Answer, FlowRateWanted, GradientWanted
from ductsolve.solver.fields import Level
from ductsolve.solver.flow import DuctFlow, LevelRecord, Status
from ductsolve.solver.levels import first_level, refine
from ductsolve.solver.startup import LimitLevel, starts
from ductsolve.solver.working import beyond_table

TRIANGLE_BUDGET = 40_000
METHODS = ("newton", "picard")
NARROWEST = 1e-7  # brackets are not asked to be narrower: rounding sets in
TYPICAL_GROWTH = 1.5  # of the triangles from one level to the next, at least
FAINT_SHARE = 0.25
SETTLED = 0.1  # of the accuracy: largest estimated error of the best estimate
FEWEST_LEVELS = 2  # the best estimate of a power law looks back one level


def solve(
    section: Section,
    fluid: Fluid,
    *,
    pressure_gradient: float | None = None,
    flow_rate: float | None = None,
    accuracy: float = 0.01,
    method: str = "newton",
    triangle_budget: int = TRIANGLE_BUDGET,
    progress: Callable[[LevelRecord], None] | None = None,
) -> DuctFlow:
    """Fully developed laminar flow, to a guaranteed accuracy.

    Refines the mesh until the relative half-width of the guaranteed bracket on the answer,
    (high - low)/(high + low), is at most ``accuracy``.

    Parameters
    ----------
    section, fluid : where and what
    pressure_gradient : -dp/dz [Pa/m]; the flow rate is the answer
    flow_rate : [m3/s]; the pressure gradient is the answer. Exactly one of the two is given
    accuracy : relative half-width asked of the bracket
    method : "newton", or "picard" on the apparent viscosity (slower, for comparison)
    triangle_budget : refinement stops beyond this many triangles in the part that is solved
    progress : called with the record of every level

    Warns
    -----
    DuctsolveWarning
        when a tabulated flow curve is used outside its table, and how far

    Raises
    ------
    DutyError
        when the duty is missing, doubled, not positive or not finite, or the accuracy out of range
    """
    _check_objects(section, fluid)
    _check(pressure_gradient, flow_rate, accuracy, method)
    if not is_finite_number(triangle_budget) or triangle_budget < 1:
        raise DutyError(f"triangle_budget must be a positive number, found {triangle_budget!r}")
    picard = method == "picard"
    if pressure_gradient is not None:
        duty = FlowRateWanted(section, fluid, float(pressure_gradient), accuracy, picard)
    else:
        duty = GradientWanted(section, fluid, float(flow_rate), accuracy, picard)
    # Overflow and underflow are looked for in the potential; numpy need not warn of them.
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        return _march(section, duty, accuracy, triangle_budget, progress)


def _march(section, duty, accuracy, triangle_budget, progress) -> DuctFlow:
    """Level after level until the bracket is narrow enough or the budget used up."""
    level, psi, history, faint = first_level(section), None, [], False
    while True:
        last = _last(level, triangle_budget, faint)
        answer = duty.answer(level, psi, final=last)
        history.append(_record(answer))
        if progress:
            progress(history[-1])
        still = answer.iterate.bracket.low <= 0
        rest = _at_rest(duty, answer, history) if still and not faint else None
        if rest:
            return rest
        if _reached(answer, accuracy, len(history)):
            return _flow(duty, answer, Status.ANSWERED, history)
        if last:
            return _flow(duty, answer, Status.BUDGET, history)
        faint = still
        level, psi = refine(answer.iterate)


def _last(level: Level, budget: float, faint: bool) -> bool:
    """Whether the next level would exceed the budget of triangles, smaller where no flow has shown yet: what
    does not show on a fine mesh is too faint for any affordable one."""
    return len(level.mesh.triangles) * TYPICAL_GROWTH > budget * (FAINT_SHARE if faint else 1.0)


def _at_rest(duty, answer: Answer, history) -> DuctFlow | None:
    """The flow that is none, or that cannot be told from none; None where the gradient moves the fluid."""
    if not isinstance(duty, FlowRateWanted) or duty.fluid.yield_stress == 0:
        return None
    moves, limit = starts(duty.section, duty.fluid, duty.gradient)
    if moves is None:
        return _flow(duty, duty.undecided(answer), Status.UNDECIDED, history)
    return None if moves else _rest(duty, limit, history)


def _reached(answer: Answer, accuracy: float, levels: int) -> bool:
    """Whether the bracket is narrow enough and the best estimate in it has come to rest."""
    width = answer.half_width
    if width is None or width > accuracy:
        return False
    settled = levels >= FEWEST_LEVELS and answer.error <= SETTLED * accuracy
    return settled or width < accuracy / 10


def _record(answer: Answer) -> LevelRecord:
    iterate = answer.iterate
    return LevelRecord(
        triangles=len(iterate.level.mesh.triangles),
        stress_steps=iterate.stress_steps,
        velocity_steps=iterate.velocity.steps,
        gap=iterate.bracket.width / max(iterate.bracket.high, 1e-300),
        half_width=answer.half_width,
    )


def _flow(duty, answer: Answer, status: Status, history) -> DuctFlow:
    """The answer for the whole section, its fields scaled to the flow rate reported."""
    iterate, outcome = answer.iterate, duty.outcome(answer)
    computed = duty.copies * iterate.flow
    flow = DuctFlow(
        section=duty.section,
        fluid=duty.fluid,
        pressure_gradient=outcome.gradient,
        flow_rate=outcome.rate,
        pressure_gradient_bracket=outcome.gradient_bracket,
        flow_rate_bracket=outcome.rate_bracket,
        estimated_error=answer.error,
        accuracy=duty.accuracy,
        status=status,
        history=tuple(history),
        level=iterate.level,
        psi=iterate.psi,
        velocity_field=iterate.velocity.local * (outcome.rate / computed if computed > 0 else 0.0),
        solved_gradient=iterate.gradient,
        gap=duty.copies * iterate.bracket.width,
    )
    beyond = beyond_table(flow)
    if beyond:
        warnings.warn(beyond, DuctsolveWarning, stacklevel=3)
    return flow


def _rest(duty, limit: LimitLevel, history) -> DuctFlow:
    """No flow, proved by a balanced stress that nowhere exceeds the yield stress."""
    return DuctFlow(
        section=duty.section,
        fluid=duty.fluid,
        pressure_gradient=duty.gradient,
        flow_rate=0.0,
        pressure_gradient_bracket=(duty.gradient, duty.gradient),
        flow_rate_bracket=(0.0, 0.0),
        estimated_error=0.0,
        accuracy=duty.accuracy,
        status=Status.NO_FLOW,
        history=tuple(history),
        level=limit.level,
        psi=limit.psi,
        velocity_field=np.zeros_like(limit.psi),
        solved_gradient=duty.gradient,
        gap=0.0,
    )


def _check_objects(section, fluid):
    """Refuse what is no section or no fluid."""
    if not isinstance(section, Section):
        raise SectionError(
            f"section must come from rectangle(...), annulus(...) or the like, found {section!r}"
        )
    if isinstance(fluid, type) or not callable(getattr(fluid, "complementary", None)):
        raise FluidError(f"fluid must be a law such as PowerLaw(...) or a FlowCurve, found {fluid!r}")


def _check(pressure_gradient, flow_rate, accuracy, method):
    """Refuse a duty that cannot be answered."""
    given = {"pressure_gradient": pressure_gradient, "flow_rate": flow_rate}
    given = {name: value for name, value in given.items() if value is not None}
    if len(given) != 1:
        found = "both" if given else "neither"
        raise DutyError(f"give exactly one of pressure_gradient and flow_rate; found {found}")
    for name, value in given.items():
        if not is_finite_number(value) or value <= 0:
            raise DutyError(f"{name} must be a positive finite number in SI units, found {value!r}")
    if not is_finite_number(accuracy) or not NARROWEST <= accuracy < 1:
        raise DutyError(f"accuracy must lie between {NARROWEST:g} and 1 (0.01 is 1 %), found {accuracy!r}")
    if method not in METHODS:
        raise DutyError(f"method must be one of {', '.join(METHODS)}, found {method!r}")
