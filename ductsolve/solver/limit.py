"""The least gradient that moves a yield-stress fluid, from both sides.

Per unit yield stress it is h = min over parts of the section of outline length / area (the section's Cheeger
constant), and 1/h is the least possible largest stress per unit gradient of a balanced stress. So any
balanced stress of largest magnitude M gives h >= 1/M, and any part of the section gives h <= length/area.

M is minimised by a barrier method over the stress function; the multipliers of its constraints are a
velocity whose superlevel sets are near-optimal parts, which descent on their outline then improves.

Sources: Mosolov & Miasnikov (1965, 1966); Kawohl & Lachand-Robert (2006); Strang (1983) for the duality.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.solver.fields import Level, curl, curl_transposed, size
from ductsolve.solver.newton import TINY, line_search, tensor
from ductsolve.solver.quadratic import Elements, corner_rule
from ductsolve.solver.superlevel import PositiveParts, least_ratio
from ductsolve.solver.system import SingularError, System
from ductsolve.solver.walls import WallPoints

FIRST_WEIGHT, WEIGHT_GROWTH = 3.0, 3.0
LAST_WEIGHT = 10.0  # over the accuracy: what the barrier leaves is about its inverse
SMOOTH_FIELDS = 3  # velocities of the first weights have the smoothest superlevel sets
WALL_LAYER = 0.1  # of the hydraulic diameter: weight of the wall's constraints against the bulk's
LEAST_SLACK = 1e-9  # of the limit squared
START_SLACK = 1.2  # first limit over the largest stress
MOST_STEPS = 25  # Newton steps a weight
CENTRED = 1e-2  # decrement, per unit of barrier weight, that counts as centred
MARKING_WEIGHT = 243.0  # beyond it velocities are too sharp to tell where to refine
THRESHOLDS = 60


@dataclass(frozen=True, eq=False)
class LimitBracket:
    """Bounds on h [1/m] on one level, for walls on the mesh edges.

    Attributes
    ----------
    low, high : 1/M of a balanced stress, and length/area of a part of the section
    doubt : what curved walls may change either by, relative
    psi : (n_triangles, 6) stress function of that stress per unit gradient [m2]
    gap : (n_triangles,) how far each triangle's stress and velocity are from belonging together
    """

    low: float
    high: float
    doubt: float
    psi: np.ndarray
    gap: np.ndarray


class _Points:
    """Where the stress is held below the limit: corners of triangles, and the walls."""

    def __init__(self, level: Level, layer: float):
        self.level, self.layer = level, layer
        self.bulk = Elements(level.mesh, corner_rule(0))
        self.wall = WallPoints(level.mesh, level.origin)
        self.wall_weights = self.wall.weights * layer
        self.total = float(self.bulk.weights.sum() + self.wall_weights.sum())

    def stress(self, psi):
        """Stress at the corners (2, n_triangles, 3) and traction at the wall points (n, 3) [m]."""
        return self.level.stress(psi, self.bulk), self.wall.traction(psi)

    def change(self, psi):
        """The same for a change of the stress function."""
        return curl(self.bulk.gradient(psi)), self.wall.traction_change(psi)

    def slack(self, stress, limit):
        """limit^2 - stress^2 at all points; positive inside."""
        bulk, wall = stress
        return limit**2 - bulk[0] ** 2 - bulk[1] ** 2, limit**2 - wall**2

    def barrier(self, stress, limit):
        """- sum of weight x ln(slack); infinite outside and where rounding would lead there."""
        bulk, wall = self.slack(stress, limit)
        if limit <= 0 or min(bulk.min(), wall.min(initial=np.inf)) <= LEAST_SLACK * limit**2:
            return np.inf
        return -float((self.bulk.weights * np.log(bulk)).sum() + (self.wall_weights * np.log(wall)).sum())


def bracket_limit(level: Level, psi: np.ndarray, hydraulic_diameter: float, accuracy: float) -> LimitBracket:
    """Bracket h on one level, to about ``accuracy`` as far as the mesh allows."""
    points = _Points(level, WALL_LAYER * hydraulic_diameter)
    limit = START_SLACK * _largest(points.stress(psi))
    weight, last, fields = FIRST_WEIGHT, LAST_WEIGHT / accuracy, []
    while True:
        psi, limit = _centre(points, psi, limit, weight * points.total / limit)
        velocity = _multipliers(points, points.stress(psi), limit)
        if len(fields) < SMOOTH_FIELDS:
            fields.append(level.nodal(velocity))
        if weight <= MARKING_WEIGHT:
            marking = velocity
        if weight >= last:
            break
        weight = min(weight * WEIGHT_GROWTH, last)
    high = least_ratio(PositiveParts(level), fields, THRESHOLDS)
    low = 1 / largest_stress(level, psi)
    deviation = level.mesh.edge_deviation.max(initial=0.0)
    doubt = 8 * deviation / hydraulic_diameter  # a wall out of place changes length/area by 4 d/D; doubled
    return LimitBracket(low, high, doubt, psi, _gap(points, psi, marking, 1 / low))


def _largest(stress):
    bulk, wall = stress
    return float(max(size(bulk).max(), np.abs(wall).max(initial=0.0)))


def largest_stress(level: Level, psi: np.ndarray) -> float:
    """Largest stress magnitude per unit gradient [m]: at corners of straight triangles, where a linear
    field is largest; on curved ones sampled, with the last refinement of the samples added once more."""
    bulk = Elements(level.mesh, corner_rule(0))
    most = float(size(level.stress(psi, bulk)).max())
    curved = np.flatnonzero(level.mesh.curved)
    if not len(curved):
        return most
    coarse, fine = (
        float(size(level.stress(psi[curved], elements)).max())
        for elements in (Elements(level.mesh, corner_rule(n), curved) for n in (2, 3))
    )
    return max(most, fine + (fine - coarse))


def _centre(points, psi, limit, weight):
    """Newton on weight x limit + barrier over stress function and limit together."""
    system = points.level.stress_system
    for _ in range(MOST_STEPS):
        stress = points.stress(psi)
        slope, slope_limit, bend, mixed, bend_limit = _derivatives(points, stress, limit)
        try:
            solve = system.factor(bend)
        except SingularError:
            break
        direct, coupled = system.spread(solve(-slope)), system.spread(solve(mixed))
        step_limit = -(weight + slope_limit + np.sum(mixed * direct)) / (bend_limit - np.sum(mixed * coupled))
        step_psi = direct - step_limit * coupled
        decrement = -float(np.sum(slope * step_psi) + (weight + slope_limit) * step_limit)
        if not np.isfinite(decrement):
            break
        change = points.change(step_psi)

        def merit(t, stress=stress, change=change, limit=limit, step_limit=step_limit):
            moved = tuple(s + t * c for s, c in zip(stress, change, strict=True))
            return weight * (limit + t * step_limit) + points.barrier(moved, limit + t * step_limit)

        t, _ = line_search(merit, decrement)
        if t == 0:
            break
        psi, limit = psi + t * step_psi, limit + t * step_limit
        if decrement < CENTRED * points.total:
            break
    return psi, limit


def _derivatives(points, stress, limit):
    """Slopes and curvatures of the barrier by the stress function (local) and by the limit."""
    bulk, wall = stress
    slack, wall_slack = points.slack(stress, limit)
    weights, wall_weights = points.bulk.weights, points.wall_weights
    secant, tangent = _fluidity(slack, limit)
    wall_secant, wall_tangent = _fluidity(wall_slack, limit)
    direction = curl_transposed(bulk / np.maximum(size(bulk), TINY))
    bend = points.bulk.stiffness(tensor(tangent, secant, direction))
    points.wall.add_traction_stiffness(bend, points.layer * wall_tangent)
    slope = points.bulk.load(curl_transposed(secant * bulk))
    points.wall.add_traction_load(slope, points.layer * wall_secant * wall)
    mixed = points.bulk.load(curl_transposed(-4 * limit * bulk / slack**2))
    points.wall.add_traction_load(mixed, points.layer * -4 * limit * wall / wall_slack**2)
    slope_limit = -2 * limit * ((weights / slack).sum() + (wall_weights / wall_slack).sum())
    bend_limit = 4 * limit**2 * ((weights / slack**2).sum() + (wall_weights / wall_slack**2).sum())
    bend_limit += slope_limit / limit
    return slope, slope_limit, bend, mixed, bend_limit


def _fluidity(slack, limit):
    """Secant and tangent of the barrier - ln(slack) by the stress."""
    return 2 / slack, 2 * (2 * limit**2 - slack) / slack**2


def _multipliers(points, stress, limit):
    """Velocity (n_triangles, 6), free to slip at walls, nearest to the multipliers of the constraints."""
    bulk, wall = stress
    slack, wall_slack = points.slack(stress, limit)
    secant, tangent = _fluidity(slack, limit)
    wall_secant, wall_tangent = _fluidity(wall_slack, limit)
    direction = bulk / np.maximum(size(bulk), TINY)
    stiffness = points.bulk.stiffness(tensor(1 / tangent, 1 / secant, direction))
    points.wall.add_value_stiffness(stiffness, 1 / (wall_tangent * points.layer))
    load = points.bulk.load(bulk * secant / tangent)
    points.wall.add_value_load(load, wall * wall_secant / wall_tangent)
    system = System(points.level.mesh.triangles)
    return system.spread(system.factor(stiffness)(load))


def _gap(points, psi, velocity, limit):
    """limit |grad w| - stress . grad w, over triangles and their walls."""
    elements, wall = points.level.elements, points.wall
    rate = elements.gradient(velocity)
    gap = elements.integral(limit * size(rate) - (points.level.stress(psi) * rate).sum(axis=0))
    slip = wall.values(velocity)
    at_wall = wall.weights * (limit * np.abs(slip) - wall.traction(psi) * slip)
    np.add.at(gap, wall.owner, at_wall.sum(axis=1))
    return gap
