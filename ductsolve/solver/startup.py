"""Start-up gradient of a yield-stress fluid, and whether a given gradient starts it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np

from ductsolve.errors import DutyError, FluidError, is_finite_number
from ductsolve.mesh.sections import Section, check_section
from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.fields import Level
from ductsolve.solver.levels import dominant, first_level
from ductsolve.solver.limit import LimitBracket, bracket_limit
from ductsolve.solver.newton import balance

TRIANGLE_BUDGET = 30_000
AIM = 0.4  # of the accuracy asked: narrower, for the sake of the best estimate inside
LARGEST_SHARE = 0.9  # of the bracket below the limit, as measured: the upper bound is the sharper
DECISION_ACCURACY = 1e-3  # nearer to the start-up gradient than this, flow or rest is left undecided


@dataclass(frozen=True, eq=False)
class StartUp:
    """The pressure gradient below which a yield-stress fluid rests and above which it flows.

    Attributes
    ----------
    bracket : guaranteed (low, high) [Pa/m]
    estimate : best estimate [Pa/m]
    accuracy : relative half-width that was asked of the bracket
    reached : whether the bracket is that narrow
    triangles : in the part of the section that was worked on
    """

    bracket: tuple[float, float]
    estimate: float
    accuracy: float
    reached: bool
    triangles: int


@dataclass(frozen=True, eq=False)
class LimitLevel:
    """Bounds on the start-up gradient per unit yield stress [1/m], the best of all levels so far.

    Attributes
    ----------
    low, high, estimate : [1/m]
    level, psi : mesh and balanced stress that prove ``low``
    """

    low: float
    high: float
    estimate: float
    level: Level = field(repr=False)
    psi: np.ndarray = field(repr=False)


def start_up_gradient(section: Section, yield_stress: float, *, accuracy: float = 0.01) -> StartUp:
    """Bracket the gradient that starts a fluid of this yield stress, whatever its law beyond yield.

    Parameters
    ----------
    section : flow area
    yield_stress : [Pa]
    accuracy : relative half-width asked of the bracket

    Raises
    ------
    FluidError, DutyError
        when the yield stress is not positive or the accuracy out of range
    """
    check_section(section)
    if not is_finite_number(yield_stress) or yield_stress <= 0:
        raise FluidError(f"yield_stress must be positive and finite [Pa], found {yield_stress!r}")
    if not is_finite_number(accuracy) or not 1e-5 <= accuracy < 1:
        raise DutyError(f"accuracy must lie between 1e-05 and 1 (0.01 is 1 %), found {accuracy!r}")
    yield_stress = float(yield_stress)
    for found in limit_levels(section, AIM * accuracy):
        if found.high - found.low <= AIM * accuracy * (found.high + found.low):
            break
    reached = found.high - found.low <= accuracy * (found.high + found.low)
    return StartUp(
        bracket=(float(found.low * yield_stress), float(found.high * yield_stress)),
        estimate=found.estimate * yield_stress,
        accuracy=accuracy,
        reached=bool(reached),
        triangles=len(found.level.mesh.triangles),
    )


def starts(section: Section, fluid: Fluid, gradient: float) -> tuple[bool | None, LimitLevel]:
    """Whether a gradient [Pa/m] moves a yield-stress fluid: proved True or False, None if too near to tell.

    The second part holds the bounds it rests on.
    """
    wanted = gradient / fluid.yield_stress
    for found in limit_levels(section, DECISION_ACCURACY):
        if wanted <= found.low:
            return False, found
        if wanted > found.high:
            return True, found
        if found.high - found.low <= DECISION_ACCURACY * found.high:
            break
    return None, found


def limit_levels(section: Section, accuracy: float) -> Iterator[LimitLevel]:
    """Ever narrower bounds, level after level until the triangle budget is used up."""
    level = first_level(section)
    psi, best, before = balance(level), None, None
    while True:
        now = bracket_limit(level, psi, section.hydraulic_diameter, accuracy)
        best = _best(best, before, now, level)
        yield best
        if 2 * len(level.mesh.triangles) > TRIANGLE_BUDGET:
            return
        before = now
        level, psi = level.refined(dominant(now.gap), now.psi)


def _best(best, before: LimitBracket | None, now: LimitBracket, level: Level) -> LimitLevel:
    """Bounds of all levels together; the estimate divides the last bracket by how much each bound moved."""
    low, high = now.low * (1 - now.doubt), now.high * (1 + now.doubt)
    share = LARGEST_SHARE
    if before is not None:
        below, above = abs(now.low - before.low), abs(now.high - before.high)
        share = min(share, below / (below + above) if below + above > 0 else share)
    newer = best is None or low >= best.low
    if best is not None:
        low, high = max(low, best.low), min(high, best.high)
    bare_low, bare_high = low / (1 - now.doubt), high / (1 + now.doubt)
    return LimitLevel(
        low=low,
        high=high,
        estimate=float(np.clip(bare_low + share * (bare_high - bare_low), low, high)),
        level=level if newer else best.level,
        psi=now.psi if newer else best.psi,
    )
