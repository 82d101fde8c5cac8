"""From the potential to the flow rate.

For any n > 0 and h = F - F*(stress(rate))/n,

    G Q = (1 + 1/n) Phi + int h,

and -int h is the slope at s = 0 of Phi_s, the potential of the fluid whose curve is
stress + s (stress - rate stress'/n). Phi_s is convex in s, so upper bounds of it at +s and -s bracket the
slope. Every n and s is valid; the best come from the curvature of Phi_s, one linear system away.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ductsolve.errors import FluidError
from ductsolve.solver.bracket import dissipation, upper_bound
from ductsolve.solver.fields import size
from ductsolve.solver.levels import IDLE, Iterate
from ductsolve.solver.newton import Capped, relax_stress, relax_velocity

LARGEST_TILT, SMALLEST_TILT = 0.3, 1e-7
TILT_IDLE = 0.1  # iterations of tilted fluids end when a step gains this part of the gap
INDEX_RANGE = (0.05, 3.0)


@dataclass(frozen=True)
class Response:
    """How the potential bends, from the linearised velocity system of an iterate.

    Tilting the fluid by s changes the potential by s^2/2 (a - 2 b/n + d/n^2) to second order.

    Attributes
    ----------
    a, b, d : coefficients [W/m]; ``a`` is also G dQ/dG x G
    """

    a: float
    b: float
    d: float

    @property
    def index(self) -> float:
        """The n that bends the potential least."""
        return float(np.clip(self.d / self.b if self.b > 0 else INDEX_RANGE[0], *INDEX_RANGE))

    def curvature(self, index: float) -> float:
        """Second derivative of the potential by the tilt [W/m]."""
        return max(self.a - 2 * self.b / index + self.d / index**2, 0.0)


def response(iterate: Iterate) -> Response:
    """Curvatures of the potential about an iterate."""
    level, velocity = iterate.level, iterate.velocity
    fluid, elements = iterate.capped.fluid, level.elements
    stress = velocity.stress
    drive = elements.load(stress)
    slope = elements.load(fluid.local_exponent(fluid.rate(size(stress))) * stress)
    spread = level.velocity_system.spread
    by_drive, by_slope = spread(velocity.solve(drive)), spread(velocity.solve(slope))
    return Response(
        a=float(np.sum(drive * by_drive)),
        b=float(np.sum(slope * by_drive)),
        d=float(np.sum(slope * by_slope)),
    )


def expected_half_width(iterate: Iterate, bend: Response) -> float:
    """Relative half-width of the bracket on the flow rate that ``tilted_bracket`` should give."""
    curvature = bend.curvature(bend.index)
    tilt = _tilt(iterate.bracket.width, curvature)
    width = iterate.bracket.width / tilt + tilt * curvature / 2
    return width / max(iterate.gradient * iterate.flow, 1e-300)


def gap_wanted(iterate: Iterate, bend: Response, accuracy: float) -> float:
    """Gap, relative to the potential, at which the flow rate would be known to ``accuracy``."""
    work = accuracy * iterate.gradient * iterate.flow
    curvature = bend.curvature(bend.index)
    tilt = min(LARGEST_TILT, work / curvature) if curvature > 0 else LARGEST_TILT
    gap = tilt * (work - tilt * curvature / 2)
    return gap / max(iterate.bracket.high, 1e-300)


def _tilt(gap, curvature):
    wanted = np.sqrt(2 * gap / curvature) if curvature > 0 else LARGEST_TILT
    return float(np.clip(wanted, SMALLEST_TILT, LARGEST_TILT))


def homogeneous_bracket(iterate: Iterate, index: float) -> tuple[float, float]:
    """Bracket on the flow rate of a power law, whose potential is n/(n+1) G Q exactly."""
    factor = (1 + 1 / index) / iterate.gradient
    return factor * iterate.bracket.low, factor * iterate.bracket.high


def tilted_bracket(iterate: Iterate, bend: Response, goal: float) -> tuple[float, float]:
    """Bracket (low, high) on the flow rate of the part for any fluid [m3/s]."""
    index = bend.index
    tilt = _tilt(iterate.bracket.width, bend.curvature(index))
    while True:
        try:
            fluids = [iterate.capped.fluid.tilted(sign * tilt, index) for sign in (1, -1)]
            break
        except FluidError:
            tilt /= 2
    plus, minus = (_tilted_bound(iterate, fluid, goal) for fluid in fluids)
    low = (1 + 1 / index + 1 / tilt) * iterate.bracket.low - plus / tilt
    share = 1 + 1 / index - 1 / tilt  # of the untilted potential in the upper bound, either sign
    high = minus / tilt + share * (iterate.bracket.high if share > 0 else iterate.bracket.low)
    return max(low, 0.0) / iterate.gradient, high / iterate.gradient


def _tilted_bound(iterate, fluid, goal):
    """Upper bound on the potential of a tilted fluid."""
    capped = Capped(fluid, iterate.capped.fluidity, iterate.capped.picard)
    psi, _ = relax_stress(iterate.level, capped, iterate.gradient, iterate.psi, TILT_IDLE * goal)
    return upper_bound(iterate.level, fluid, iterate.gradient, psi, iterate.bracket.width)


def expected_half_width_by_energy(iterate: Iterate, bend: Response) -> float:
    """Relative half-width of the bracket on the gradient that ``energy_bracket`` should give."""
    return math.sqrt(2 * iterate.bracket.width / max(bend.a, 1e-300))


def gap_wanted_by_energy(iterate: Iterate, bend: Response, accuracy: float) -> float:
    """Gap, relative to the potential, at which the gradient would be known to ``accuracy`` that way."""
    return accuracy**2 * bend.a / 2 / max(iterate.bracket.high, 1e-300)


def energy_bracket(iterate: Iterate, bend: Response, flow: float, goal: float) -> tuple[float, float]:
    """Bracket (low, high) [Pa/m] on the gradient that drives ``flow`` [m3/s] through the part.

    The least dissipation E(Q) = min int F(|grad w|) over velocities of flow rate Q is convex with slope
    G(Q); any velocity bounds it above, and G0 Q - (upper bound of the potential at any G0) below. So

        (E_low(Q) - E_up(Q1))/(Q - Q1) <= G(Q) <= (E_up(Q2) - E_low(Q))/(Q2 - Q),     Q1 < Q < Q2.
    """
    gradient = iterate.gradient
    least = gradient * flow - iterate.bracket.high
    step = max(expected_half_width_by_energy(iterate, bend), SMALLEST_TILT)
    low, high = 0.0, math.inf
    for at in (gradient * (1 - step), gradient * (1 + step)):
        psi, _ = relax_stress(iterate.level, iterate.capped, at, iterate.psi, IDLE * goal)
        velocity = relax_velocity(iterate.level, iterate.capped, at, psi, IDLE * goal).local
        beside = float(np.sum(iterate.level.elements.unit_load * velocity))
        spent = dissipation(iterate.level, iterate.capped.fluid, velocity, iterate.bracket.width)
        spent += iterate.bracket.wall
        if beside < flow:
            low = max(low, (least - spent) / (flow - beside))
        elif beside > flow:
            high = min(high, (spent - least) / (beside - flow))
    return low, high
