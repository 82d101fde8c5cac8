"""Minimising the two energies: steps in the stress, where no fluid is singular."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.fields import Level, curl, curl_transposed, size
from ductsolve.solver.system import SingularError

Array = np.ndarray

MOST_STEPS = 60
SUFFICIENT = 1e-4  # part of the predicted gain a step must bring (Armijo)
PATIENCE = 25
SMALLEST_SHARE = 1e-3
SMALLEST_STEP = 2.0**-20
TINY = 1e-200


@dataclass(frozen=True)
class Capped:
    """The fluid with its apparent viscosity capped: the rate gains ``fluidity`` x stress.

    ``fluidity`` [1/(Pa s)] is the only regularisation; brackets never use it.
    """

    fluid: Fluid
    fluidity: float
    picard: bool = False

    def linearised(self, magnitude):
        """Secant and tangent fluidity [1/(Pa s)] at a stress magnitude [Pa].

        The tangent is what Newton's method needs; Picard's on the apparent viscosity takes the secant
        for both.
        """
        magnitude = np.maximum(magnitude, TINY)
        secant = self.fluid.rate(magnitude) / magnitude + self.fluidity
        tangent = secant if self.picard else self.fluid.rate_slope(magnitude) + self.fluidity
        return secant, tangent

    def energy(self, magnitude):
        """Complementary potential of the capped fluid [Pa/s]."""
        return self.fluid.complementary(magnitude) + self.fluidity / 2 * magnitude**2


def tensor(along, across, direction):
    """Symmetric tensor (11, 12, 22): ``along`` the direction, ``across`` it."""
    change = along - across
    x, y = direction
    return across + change * x * x, change * x * y, across + change * y * y


def line_search(energy, predicted):
    """Largest of 1, 1/2, 1/4, ... with enough of the predicted gain, or 0; and the energy there."""
    start = energy(0.0)
    step = 1.0
    while step >= SMALLEST_STEP:
        value = energy(step)
        if value <= start - SUFFICIENT * step * predicted:
            return step, value
        step /= 2
    return 0.0, start


def balance(level: Level) -> Array:
    """Stress function (n_triangles, 6) of the Newtonian fluid: the start for every other."""
    elements, system = level.elements, level.stress_system
    one = np.ones_like(elements.weights)
    known = level.stress(np.zeros((elements.count, 6)))
    solve = system.factor(elements.stiffness((one, np.zeros_like(one), one)))
    return system.spread(solve(-elements.load(curl_transposed(known))))


def relax_stress(level: Level, capped: Capped, gradient: float, psi: Array, stop: float):
    """Newton (or Picard) on the complementary energy E.

    Ends after the step whose predicted gain is at most ``stop`` x E, or that finds nothing to gain.
    Returns the stress function (n_triangles, 6) and the number of steps.
    """
    elements, system = level.elements, level.stress_system
    stress = level.stress(psi)
    for step in range(1, MOST_STEPS + 1):  # noqa: B007
        magnitude = size(stress)
        secant, tangent = capped.linearised(gradient * magnitude)
        direction = curl_transposed(stress / np.maximum(magnitude, TINY))
        try:
            solve = system.factor(elements.stiffness(tensor(tangent, secant, direction)))
        except SingularError:
            break
        load = -elements.load(curl_transposed(secant * stress))
        change = system.spread(solve(load))
        predicted = gradient**2 * float(np.sum(load * change))
        if not np.isfinite(predicted):
            break
        moved = curl(elements.gradient(change))

        def energy(t, stress=stress, moved=moved):
            return elements.integral(capped.energy(gradient * size(stress + t * moved))).sum()

        t, value = line_search(energy, predicted)
        psi, stress = psi + t * change, stress + t * moved
        if predicted / 2 <= stop * value or t == 0:
            break
    return psi, step


@dataclass(frozen=True, eq=False)
class Velocity:
    """A velocity and what was at hand when it was found.

    Attributes
    ----------
    local : (n_triangles, 6) velocity [m/s]
    stress : (2, n_triangles, n) stress at the points of assembly it was found with [Pa]
    solve : function from local loads to the unknowns of the last linearised system; None without one
    steps : linear systems solved
    """

    local: Array
    stress: Array
    solve: Callable[[Array], Array] | None
    steps: int


def relax_velocity(level: Level, capped: Capped, gradient: float, psi: Array, stop: float) -> Velocity:
    """Velocity that best belongs to the stress, by steps in the stress at the quadrature points.

    A velocity is worth G int w - int F(|grad w|), its lower bound on the potential. Ends at the first step
    (the second with a yield stress) that adds at most ``stop`` times the best worth, or when ``PATIENCE``
    steps found nothing of worth; returns the best velocity met.
    """
    elements, system = level.elements, level.velocity_system
    stress = gradient * level.stress(psi)
    best, most, idle, solve = np.zeros((elements.count, 6)), 0.0, 0, None
    patience = 2 if capped.fluid.yield_stress else 1  # plugs make the worth of steps erratic
    for step in range(1, MOST_STEPS + 1):  # noqa: B007
        magnitude = size(stress)
        secant, tangent = capped.linearised(magnitude)
        viscosity = tensor(1 / tangent, 1 / secant, stress / np.maximum(magnitude, TINY))
        try:
            solve = system.factor(elements.stiffness(viscosity))
        except SingularError:
            break
        pull = stress * (1 - secant / tangent)  # the rate secant x stress lies along the stress
        velocity = system.spread(solve(gradient * elements.unit_load - elements.load(pull)))
        rate = elements.gradient(velocity)
        share, worth = _worth(elements, capped.fluid, gradient, velocity, size(rate))
        idle += worth - most <= stop * most
        if worth > most:
            best, most = share * velocity, worth
        if idle == (patience if most > 0 else PATIENCE) or not np.isfinite(worth):
            break
        moved = _applied(viscosity, rate - secant * stress)

        def energy(t, stress=stress, moved=moved):
            return elements.integral(capped.energy(size(stress + t * moved))).sum()

        predicted = -float(np.sum(elements.weights * secant * np.sum(stress * moved, axis=0)))
        stress = stress + line_search(energy, max(predicted, 0.0))[0] * moved
    return Velocity(best, stress, solve, step)


def _worth(elements, fluid, gradient, velocity, rate):
    """Share of a velocity that is worth most (of 1, 1/2, 1/4, ...; 1 unless that is worth nothing) and
    its worth: close to rest the right shape often comes too large."""
    drive = gradient * float(np.sum(elements.unit_load * velocity))
    share = 1.0
    while share > SMALLEST_SHARE:
        worth = share * drive - float(elements.integral(fluid.potential(share * rate)).sum())
        if worth > 0 or not fluid.yield_stress:
            return share, worth
        share /= 2
    return 0.0, 0.0


def _applied(matrix, vector):
    """Symmetric matrix (11, 12, 22) times vector."""
    return np.stack(
        [matrix[0] * vector[0] + matrix[1] * vector[1], matrix[1] * vector[0] + matrix[2] * vector[1]]
    )
