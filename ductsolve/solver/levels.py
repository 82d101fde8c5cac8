"""One level after another: relax both fields on a mesh, bracket, refine where the gap is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.mesh.sections import Section
from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.bracket import PotentialBracket, potential_bracket
from ductsolve.solver.cuts import hole_cuts
from ductsolve.solver.fields import Level, size
from ductsolve.solver.newton import TINY, Capped, Velocity, balance, relax_stress, relax_velocity

# Iterations end when a step gains this part of the gap that is hoped for ...
IDLE = 0.03
# ... and the cap on apparent viscosity may cost about the same.
CAP_COST = 0.03
LEAST_CAP, LARGEST_CAP = 1e-13, 1e-4
RESTING = 1e-3
GAP_SHARE = 0.65  # of the gap lies in the triangles that are refined (Doerfler 1996)


@dataclass(frozen=True, eq=False)
class Iterate:
    """Both fields on one level and their bracket.

    Attributes
    ----------
    level : mesh and systems
    gradient : pressure gradient the fields belong to [Pa/m]
    psi : (n_triangles, 6) stress function per unit gradient [m2]
    velocity : velocity field and its last linear system
    bracket : on the potential of the part that is solved
    capped : fluid the fields were relaxed with
    stress_steps : linear systems solved for the stress
    """

    level: Level
    gradient: float
    psi: np.ndarray
    velocity: Velocity
    bracket: PotentialBracket
    capped: Capped
    stress_steps: int

    @property
    def flow(self) -> float:
        """Flow rate of the velocity field through the part that is solved [m3/s]."""
        return float(np.sum(self.level.elements.unit_load * self.velocity.local))


def first_level(section: Section) -> Level:
    """Level of the section's first mesh."""
    mesh = section.mesh()
    return Level(mesh, np.asarray(section.origin, dtype=float), hole_cuts(mesh))


def relax(level: Level, fluid: Fluid, gradient: float, psi, goal: float, picard: bool = False) -> Iterate:
    """Relax both fields until a better iterate would hardly narrow a gap of ``goal`` x potential."""
    psi = balance(level) if psi is None else psi
    capped = Capped(fluid, _cap(level, fluid, gradient, psi, goal), picard)
    psi, steps = relax_stress(level, capped, gradient, psi, IDLE * goal)
    velocity = relax_velocity(level, capped, gradient, psi, IDLE * goal)
    bracket = potential_bracket(level, fluid, gradient, psi, velocity.local)
    return Iterate(level, gradient, psi, velocity, bracket, capped, steps)


def _cap(level, fluid, gradient, psi, goal):
    """Fluidity that caps the apparent viscosity, small against the stress-weighted mean fluidity."""
    stress = np.maximum(gradient * size(level.stress(psi)), TINY)
    weights = level.elements.weights
    typical = np.sum(weights * fluid.rate(stress) * stress) / np.sum(weights * stress**2)
    if fluid.yield_stress:  # where nothing flows yet, what would under twice the stress
        twice = 2 * max(float(stress.max()), fluid.yield_stress)
        typical = max(typical, RESTING * float(fluid.rate(np.array(twice))) / twice)
    return float(np.clip(CAP_COST * goal, LEAST_CAP, LARGEST_CAP) * typical)


def refine(iterate: Iterate) -> tuple[Level, np.ndarray]:
    """Next level and the stress function on it."""
    return iterate.level.refined(dominant(iterate.bracket.gap), iterate.psi)


def dominant(gap: np.ndarray) -> np.ndarray:
    """Mask of the fewest triangles that hold most of the gap."""
    gap = np.maximum(gap, 0.0)
    order = np.argsort(-gap)
    summed = np.cumsum(gap[order])
    marked = np.zeros(len(gap), dtype=bool)
    marked[order[: np.searchsorted(summed, GAP_SHARE * summed[-1]) + 1]] = True
    return marked
