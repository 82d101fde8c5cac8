"""Guaranteed bounds on the potential of the flow, and from it on the flow rate.

The potential is Phi(G) = max over velocities w of G int w - int F(|grad w|). Any velocity gives a lower
bound on it and any balanced stress an upper bound, int F*(|stress|), with the true fluid: neither the cap
on apparent viscosity nor an unfinished iteration can make the bounds wrong, only wide.

Sources: Prager & Synge (1947); Mosolov & Miasnikov (1965); Ekeland & Temam (1976).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.fields import Level, size
from ductsolve.solver.quadratic import Elements, corner_rule, gauss, subdivided

Array = np.ndarray

# Two rules far enough apart not to agree by accident; the finer one errs by less than this many times their
# difference.
RULES = (gauss(2), gauss(4))
MARGIN = 2.0
# Triangles whose margin exceeds this part of an equal share of the gap are subdivided ...
NOTICEABLE = 0.03
FEWEST_SHARES = 32  # ... of at least so many shares
# ... and then err by less than this part of what the subdivision changed (it errs by a 1/16 or less of that).
REMAINDER = 1 / 4
SUBDIVISIONS = (1, 3)
SAFE_SUBDIVISION = 4
WALL_SAFETY = 2.0  # the first-order price of a wall out of place, doubled


@dataclass(frozen=True, eq=False)
class Part:
    """Integral of a convex function of one field over each triangle.

    Attributes
    ----------
    value : (n_triangles,) by the finer rule
    margin : (n_triangles,) what quadrature may have it off by; bounds are widened by it
    """

    value: Array
    margin: Array


def _two_rules(density, local, elements) -> Part:
    """By elements at the points of a coarser and a finer rule."""
    coarse, fine = (geometry.integral(density(geometry, local)) for geometry in elements)
    return Part(fine, MARGIN * np.abs(fine - coarse))


def _once(level: Level, density, local) -> Part:
    return _two_rules(density, local, [level.at(rule) for rule in RULES])


def _sharpened(level: Level, density, local, part: Part, gap: float) -> Part:
    """The same with triangles subdivided where a kink (a yield surface) or steepness spoils the rules."""
    value, margin = part.value.copy(), part.margin.copy()
    enough = NOTICEABLE * abs(gap) / max(len(margin), FEWEST_SHARES)
    for depth in SUBDIVISIONS:
        worst = np.flatnonzero(margin > enough)
        if not len(worst):
            break
        elements = (Elements(level.mesh, subdivided(rule, depth), worst) for rule in RULES)
        finer = _two_rules(density, local[worst], elements)
        change = np.abs(finer.value - value[worst])
        value[worst], margin[worst] = finer.value, np.maximum(finer.margin, REMAINDER * change)
    return Part(value, margin)


def dissipation_density(fluid: Fluid):
    """F(|grad w|) of a velocity."""
    return lambda elements, velocity: fluid.potential(size(elements.gradient(velocity)))


def complementary_density(level: Level, fluid: Fluid, gradient: float):
    """F*(|stress|) of a stress function."""
    return lambda elements, psi: fluid.complementary(gradient * size(level.stress(psi, elements)))


def wall_allowance(level: Level, fluid: Fluid, gradient: float, psi: Array) -> Array:
    """What the distance between wall edges and true walls can change the potential by, (n_triangles,).

    Moving a wall by d changes the potential by int F*(wall stress) d to first order; doubled.
    """
    allowance = np.zeros(len(level.mesh.triangles))
    deviation = level.mesh.edge_deviation
    if deviation.any():
        forces = level.wall_forces
        stress = gradient * np.abs(forces(psi) / forces.lengths).max(axis=1)
        price = (
            WALL_SAFETY * fluid.complementary(stress) * deviation[forces.rows] * forces.lengths.sum(axis=1)
        )
        np.add.at(allowance, level.mesh.edge_owner[forces.rows], price)
    return allowance


@dataclass(frozen=True, eq=False)
class PotentialBracket:
    """Bounds on the potential of the part that is solved.

    Attributes
    ----------
    low, high : bounds [W/m]
    gap : (n_triangles,) contributions to their difference
    wall : what either bound was widened by for curved walls [W/m]
    """

    low: float
    high: float
    gap: Array
    wall: float

    @property
    def width(self) -> float:
        """Difference of the bounds [W/m]."""
        return self.high - self.low

    @property
    def bare(self) -> tuple[float, float]:
        """Bounds for walls on the mesh edges, to extrapolate from [W/m]."""
        return self.low + self.wall, self.high - self.wall


def potential_bracket(
    level: Level, fluid: Fluid, gradient: float, psi: Array, velocity: Array
) -> PotentialBracket:
    """Bracket from a stress function and a velocity, both (n_triangles, 6)."""
    above = complementary_density(level, fluid, gradient)
    below = dissipation_density(fluid)
    stored = _once(level, above, psi)
    spent = _once(level, below, velocity)
    elements = level.elements
    work = elements.integral(np.sum(gradient * level.stress(psi) * elements.gradient(velocity), axis=0))
    gap = float((stored.value + spent.value - work).sum())
    stored = _sharpened(level, above, psi, stored, gap)
    spent = _sharpened(level, below, velocity, spent, gap)
    wall = wall_allowance(level, fluid, gradient, psi)
    drive = gradient * float(np.sum(elements.unit_load * velocity))
    return PotentialBracket(
        low=drive - float((spent.value + spent.margin + wall).sum()),
        high=float((stored.value + stored.margin + wall).sum()),
        gap=stored.value + spent.value - work + stored.margin + spent.margin + 2 * wall,
        wall=float(wall.sum()),
    )


def upper_bound(level: Level, fluid: Fluid, gradient: float, psi: Array, gap: float) -> float:
    """Upper bound on the potential from a stress function alone; ``gap`` says what error is noticed."""
    density = complementary_density(level, fluid, gradient)
    stored = _sharpened(level, density, psi, _once(level, density, psi), gap)
    return float((stored.value + stored.margin + wall_allowance(level, fluid, gradient, psi)).sum())


def dissipation(level: Level, fluid: Fluid, velocity: Array, gap: float) -> float:
    """Upper bound on int F(|grad w|) of a velocity, for walls on the mesh edges."""
    density = dissipation_density(fluid)
    spent = _sharpened(level, density, velocity, _once(level, density, velocity), gap)
    return float((spent.value + spent.margin).sum())


def safe_potential_bracket(level: Level, fluid: Fluid, gradient: float, psi: Array, velocity: Array):
    """The same bounds by the corner rule, which cannot under-estimate a convex function.

    Proof against every doubt about quadrature on straight triangles, slower and a little wider. Returns
    (low, high) [W/m].
    """
    elements = Elements(level.mesh, corner_rule(SAFE_SUBDIVISION))
    spent = elements.integral(dissipation_density(fluid)(elements, velocity)).sum()
    stored = elements.integral(complementary_density(level, fluid, gradient)(elements, psi)).sum()
    drive = gradient * np.sum(level.elements.unit_load * velocity)
    return float(drive - spent), float(stored)
