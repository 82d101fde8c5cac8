"""The two duties: flow rate wanted at a given gradient, gradient wanted at a given flow rate.

A duty answers on one level at a time and remembers what it needs for the next: how small a gap to hope
for and, where the gradient is wanted, the gradient reached.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ductsolve.errors import DutyError
from ductsolve.mesh.sections import Section
from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.fields import Level, size
from ductsolve.solver.levels import Iterate, relax
from ductsolve.solver.rate import (
    Response,
    energy_bracket,
    expected_half_width,
    expected_half_width_by_energy,
    gap_wanted,
    gap_wanted_by_energy,
    homogeneous_bracket,
    response,
    tilted_bracket,
)
from ductsolve.solver.startup import start_up_gradient

Bracket = tuple[float, float]

FIRST_GOAL = 1e-2  # relative gap to hope for on the first level
GOAL_DROP = 8.0  # how much the gap is hoped to fall from level to level
PROMISING = 1.1  # brackets are worked out once they should come this close to the accuracy
UNKNOWN: Bracket = (0.0, math.inf)
MOVE_LEFT = 0.4  # of an estimate's last move: what it may still move
LEAST_LEFT = 0.4  # of the spread: what it may always still move
MOST_CORRECTIONS = 30
START_UP_FROM = 600  # triangles
START_UP_ACCURACY = 2e-3
NEAR_START_UP = 1.05  # gradients up to so many times the start-up gradient are bracketed from below by it
SMALLEST_POTENTIAL = 1e-280  # [W/m]
CEILING_STEPS = (0.003, 0.01, 0.03, 0.1, 0.3)
FIRST_SLACK = 0.01
SLACK = 0.1  # of the half-width that is expected


@dataclass(frozen=True, eq=False)
class Answer:
    """What one level says, for the whole section.

    Attributes
    ----------
    iterate : the fields it rests on
    estimate : best estimate of what is wanted, flow rate [m3/s] or gradient [Pa/m]
    bracket : guaranteed (low, high) on it, (0, inf) where it was not worked out
    error : estimated relative error of the estimate
    """

    iterate: Iterate
    estimate: float
    bracket: Bracket
    error: float

    @property
    def half_width(self) -> float | None:
        """Relative half-width of the bracket, None where it was not worked out."""
        return half_width(self.bracket)


@dataclass(frozen=True)
class Outcome:
    """Gradient [Pa/m] and flow rate [m3/s], of which one was given, and the bracket on each."""

    gradient: float
    rate: float
    gradient_bracket: Bracket
    rate_bracket: Bracket


def half_width(bracket: Bracket) -> float | None:
    """(high - low)/(high + low), None for a bracket not worked out."""
    low, high = bracket
    if not math.isfinite(high):
        return None
    return (high - low) / (high + low) if high > 0 else 0.0


class _Duty:
    """Common to both duties."""

    def __init__(self, section: Section, fluid: Fluid, accuracy: float, picard: bool):
        self.section, self.fluid, self.accuracy, self.picard = section, fluid, accuracy, picard
        self.copies = len(section.copies)
        self.index = fluid.power_index
        self.goal = FIRST_GOAL
        self._before: Iterate | None = None
        self._estimate: float | None = None
        self._move = 0.0

    def _relax(self, level: Level, psi, gradient: float) -> Iterate:
        iterate = relax(level, self.fluid, gradient, psi, self.goal, self.picard)
        _check_range(self.fluid, iterate.bracket.high)
        return iterate

    def _aim(self, iterate: Iterate, wanted: float):
        """Hope for the gap wanted, but not for more than a level usually brings."""
        reached = iterate.bracket.width / max(iterate.bracket.high, 1e-300)
        self.goal = min(max(wanted, reached / GOAL_DROP), FIRST_GOAL)

    def _power_law(self, iterate: Iterate) -> tuple[float, Bracket, float]:
        """Estimate, bracket and its relative half-width of the flow rate of a power law.

        The estimate extrapolates the bracket of this level and the last to no gap.
        """
        low, high = (self.copies * q for q in homogeneous_bracket(iterate, self.index))
        bare_low, bare_high = iterate.bracket.bare
        share = 0.5
        if self._before is not None:
            scale = (iterate.gradient / self._before.gradient) ** (1 + 1 / self.index)
            before_low, before_high = (scale * bound for bound in self._before.bracket.bare)
            closed = before_high - before_low - (bare_high - bare_low)
            share = (bare_low - before_low) / closed if closed > 0 else share
        potential = bare_low + min(max(share, 0.0), 1.0) * (bare_high - bare_low)
        estimate = self.copies * potential * (1 + 1 / self.index) / iterate.gradient
        self._before = iterate
        error = (high - low) / (2 * estimate) if estimate > 0 else 1.0
        return estimate, (max(low, 0.0), high), error

    def _settled(self, estimate: float, spread: float) -> float:
        """Estimated relative error of an estimate: a part of how far it moved from the level before.

        Errors fall about fourfold a level, so a small move counts no less than a quarter of the one before.
        The result lies between ``LEAST_LEFT`` of ``spread``, what is left open by bounds or by the other
        field, and all of it; it is all of it on the first level.
        """
        before, self._estimate = self._estimate, estimate
        if before is None or estimate <= 0 or not math.isfinite(estimate):
            return spread
        self._move = max(abs(before / estimate - 1), self._move / 4)
        return float(np.clip(MOVE_LEFT * self._move, LEAST_LEFT * spread, spread))


def _check_range(fluid: Fluid, potential: float):
    """Refuse a flow whose shear rates leave the range of numbers, by its potential [W/m]."""
    small = potential < SMALLEST_POTENTIAL
    if not np.isfinite(potential) or (small and fluid.yield_stress == 0):
        extreme = "small" if small else "large"
        raise DutyError(f"shear rates too {extreme} for numbers; check the units of duty, fluid and section")


def stress_flow(iterate: Iterate) -> float:
    """Flow rate of the part by the power the balanced stress dissipates, int rate x stress / G [m3/s]."""
    elements, fluid = iterate.level.elements, iterate.capped.fluid
    arm = size(iterate.level.stress(iterate.psi))
    return float(elements.integral(fluid.rate(iterate.gradient * arm) * arm).sum())


def _general_estimate(iterate: Iterate) -> tuple[float, float]:
    """Flow rate of the part by the stress, and half its relative difference from the velocity's."""
    by_stress, by_velocity = stress_flow(iterate), iterate.flow
    if by_stress <= 0:
        return by_velocity, 1.0
    return by_stress, abs(by_stress - by_velocity) / (2 * by_stress)


class FlowRateWanted(_Duty):
    """Pressure gradient given."""

    def __init__(self, section, fluid, gradient, accuracy, picard=False):
        super().__init__(section, fluid, accuracy, picard)
        self.gradient = gradient

    def answer(self, level: Level, psi, final: bool = False) -> Answer:
        """Answer on one level; ``final`` works the bracket out however wide it will be."""
        iterate = self._relax(level, psi, self.gradient)
        if self.index is not None:
            estimate, bracket, spread = self._power_law(iterate)
            self._aim(iterate, 2 * self.accuracy)
            return Answer(iterate, estimate, bracket, self._settled(estimate, spread))
        if iterate.flow <= 0:
            self._aim(iterate, 0.0)
            return Answer(iterate, 0.0, self._ceiling(iterate) if final else UNKNOWN, 1.0)
        bend = response(iterate)
        wanted = gap_wanted(iterate, bend, self.accuracy)
        bracket = UNKNOWN
        if final or expected_half_width(iterate, bend) <= PROMISING * self.accuracy:
            goal = iterate.bracket.width / iterate.bracket.high
            bracket = tuple(self.copies * q for q in tilted_bracket(iterate, bend, goal))
        estimate, spread = _general_estimate(iterate)
        self._aim(iterate, wanted)
        rate = float(np.clip(self.copies * estimate, *bracket))
        return Answer(iterate, rate, bracket, self._settled(rate, spread))

    def outcome(self, answer: Answer) -> Outcome:
        """What the answer says of gradient and flow rate."""
        return Outcome(self.gradient, answer.estimate, (self.gradient, self.gradient), answer.bracket)

    def undecided(self, answer: Answer) -> Answer:
        """The same answer when nobody can tell whether anything flows."""
        return Answer(answer.iterate, 0.0, self._ceiling(answer.iterate), 1.0)

    def _ceiling(self, iterate: Iterate) -> Bracket:
        """Between no flow and what convexity allows: Q(G) <= (Phi(G + d) - Phi(G))/d with Phi(G) >= 0."""
        ceilings = []
        for part in CEILING_STEPS:
            beyond = self._relax(iterate.level, iterate.psi, self.gradient * (1 + part))
            ceilings.append(self.copies * beyond.bracket.high / (part * self.gradient))
        return 0.0, min(ceilings)


class GradientWanted(_Duty):
    """Flow rate given."""

    def __init__(self, section, fluid, flow_rate, accuracy, picard=False):
        super().__init__(section, fluid, accuracy, picard)
        self.flow_rate = flow_rate
        self.gradient = first_gradient(section, fluid, flow_rate)
        self._floor: float | None = None
        self.slack = FIRST_SLACK  # how far ln(gradient) may stay from its aim on the next level

    def answer(self, level: Level, psi, final: bool = False) -> Answer:
        """Answer on one level; ``final`` works the bracket out however wide it will be."""
        if self.index is not None:
            return self._power_law_answer(level, psi)
        iterate, bend = self._at_flow_rate(level, psi)
        if bend is None:
            self._aim(iterate, 0.0)
            return Answer(iterate, iterate.gradient, UNKNOWN, 1.0)
        estimate, spread = _general_estimate(iterate)
        local = bend.a / (iterate.gradient * iterate.flow)  # d ln Q / d ln G
        tilted, direct = self._expected(iterate, bend)
        self.slack = min(max(SLACK * min(tilted, direct), SLACK * self.accuracy), FIRST_SLACK)
        floor = self._start_up(level)
        bracket = UNKNOWN
        near = iterate.gradient < NEAR_START_UP * floor
        if final or near or min(tilted, direct) <= PROMISING * self.accuracy:
            bracket = self._tilted(iterate, bend) if tilted <= direct else self._direct(iterate, bend)
            bracket = max(bracket[0], floor), bracket[1]
        wanted = max(
            gap_wanted(iterate, bend, self.accuracy / self.fluid.exponent_bound),
            gap_wanted_by_energy(iterate, bend, self.accuracy),
        )
        self._aim(iterate, wanted)
        gradient = iterate.gradient * (self.flow_rate / (self.copies * estimate)) ** (1 / local)
        gradient = float(np.clip(gradient, *bracket))
        return Answer(iterate, gradient, bracket, self._settled(gradient, spread / local))

    def outcome(self, answer: Answer) -> Outcome:
        """What the answer says of gradient and flow rate."""
        return Outcome(answer.estimate, self.flow_rate, answer.bracket, (self.flow_rate, self.flow_rate))

    def _power_law_answer(self, level, psi):
        iterate = self._relax(level, psi, self.gradient)
        estimate, (low, high), spread = self._power_law(iterate)
        n = self.index
        gradient = self.gradient * (self.flow_rate / estimate) ** n if estimate > 0 else math.inf
        above = self.gradient * (self.flow_rate / low) ** n if low > 0 else math.inf
        below = self.gradient * (self.flow_rate / high) ** n
        self._aim(iterate, 2 * self.accuracy / n)
        return Answer(iterate, gradient, (below, above), self._settled(gradient, n * spread))

    def _start_up(self, level) -> float:
        """Gradient below which a yield-stress fluid rests [Pa/m], proved once the mesh is fine enough for the
        proof to be cheap beside the flow; 0 before."""
        if self._floor is None and self.fluid.yield_stress and len(level.mesh.triangles) >= START_UP_FROM:
            found = start_up_gradient(self.section, self.fluid.yield_stress, accuracy=START_UP_ACCURACY)
            self._floor = found.bracket[0]
        return self._floor or 0.0

    def _expected(self, iterate, bend):
        """Expected relative half-widths by the two ways."""
        tilted = self.fluid.exponent_bound * expected_half_width(iterate, bend)
        return tilted, expected_half_width_by_energy(iterate, bend)

    def _tilted(self, iterate, bend) -> Bracket:
        """From the bracket on the flow rate: d ln G/d ln Q nowhere exceeds the largest local exponent."""
        goal = iterate.bracket.width / iterate.bracket.high
        low, high = (self.copies * q for q in tilted_bracket(iterate, bend, goal))
        power = self.fluid.exponent_bound
        above = max(1.0, (self.flow_rate / low) ** power) if low > 0 else math.inf
        return iterate.gradient * min(1.0, (self.flow_rate / high) ** power), iterate.gradient * above

    def _direct(self, iterate, bend) -> Bracket:
        """From energies at neighbouring flow rates: sharper where the flow rate is steep in the gradient."""
        goal = iterate.bracket.width / iterate.bracket.high
        return energy_bracket(iterate, bend, self.flow_rate / self.copies, goal)

    def _at_flow_rate(self, level, psi) -> tuple[Iterate, Response | None]:
        """Iterate whose flow rate is close to the one given, and its response; None if nothing flows.

        Any gradient gives a valid bracket, so a search that meshes too coarse make erratic may end early.
        """
        low, high, bend = 0.0, math.inf, None
        for _ in range(MOST_CORRECTIONS):
            iterate = self._relax(level, psi, self.gradient)
            psi = iterate.psi
            flow = self.copies * stress_flow(iterate) if iterate.flow > 0 else 0.0
            low, high = (self.gradient, high) if flow < self.flow_rate else (low, self.gradient)
            step = 0.2
            if flow > 0:
                bend = response(iterate)
                local = max(bend.a / (iterate.gradient * iterate.flow), 0.1)
                step = float(np.clip(math.log(self.flow_rate / flow) / local, -1.0, 1.0))
            if flow > 0 and min(abs(step), high / max(low, 1e-300) - 1) <= self.slack:
                break
            guess = self.gradient * math.exp(step)
            self.gradient = guess if low < guess < high else (low + high) / 2
        return iterate, bend if flow > 0 else None


def first_gradient(section: Section, fluid: Fluid, flow_rate: float) -> float:
    """Gradient at which a slot of the same hydraulic diameter passes about the same mean velocity [Pa/m].

    Exact shapes differ by tens of percent; it only starts the search.
    """
    rate = 10 * flow_rate / (section.area * section.hydraulic_diameter)
    return 4 * float(fluid.stress(np.array(rate))) / section.hydraulic_diameter
