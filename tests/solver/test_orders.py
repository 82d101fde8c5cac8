"""How fast the bracket closes under uniform refinement, and what an iteration costs meanwhile."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle
from ductsolve.rheology.laws import Bingham, CarreauYasuda, HerschelBulkley, Newtonian, PowerLaw
from ductsolve.solver.flow import Status
from ductsolve.solver.levels import first_level, relax
from ductsolve.solver.solve import solve

SECTIONS = {
    "square": rectangle(1.0, 1.0),
    "rectangle": rectangle(2.0, 1.0),
    "ellipse": ellipse(2.0, 1.0),
    "circle": circle(2.0),
    "concentric annulus": annulus(2.0, 1.0),
    "eccentric annulus": annulus(2.0, 1.0, 0.5),
}
FLUIDS = {
    "Newtonian": Newtonian(1.0),
    "n = 0.5": PowerLaw(1.0, 0.5),
    "n = 0.2": PowerLaw(1.0, 0.2),
    "n = 1.5": PowerLaw(1.0, 1.5),
    "Carreau": CarreauYasuda(5.0, 0.0, 60.0, 0.5),
    "Bingham": Bingham(0.1, 1.0),
    "Herschel-Bulkley": HerschelBulkley(0.1, 1.0, 0.5),
}
LEVELS = 4


@cache
def uniform_levels(name, fluid):
    """Iterates on the first mesh and on meshes with every triangle cut in four, each time for a gap an
    eighth of the last, as the solver hopes for."""
    level, psi, goal, iterates = first_level(SECTIONS[name]), None, 1e-3, []
    for _ in range(LEVELS):
        iterates.append(relax(level, FLUIDS[fluid], 1.0, psi, goal))
        everywhere = np.ones(len(level.mesh.triangles), dtype=bool)
        level, psi = level.refined(everywhere, iterates[-1].psi)
        goal = iterates[-1].bracket.width / iterates[-1].bracket.high / 8
    return iterates


@pytest.mark.parametrize("fluid", ["Newtonian", "n = 0.5"])
@pytest.mark.parametrize("name", SECTIONS)
def test_the_bracket_closes_with_the_fourth_power_of_the_mesh_size(name, fluid):
    iterates = uniform_levels(name, fluid)
    triangles = [len(iterate.level.mesh.triangles) for iterate in iterates]
    widths = np.array([iterate.bracket.width for iterate in iterates])
    orders = np.log2(widths[:-1] / widths[1:])
    assert [b / a for a, b in zip(triangles, triangles[1:], strict=False)] == [4] * (LEVELS - 1)
    # A rectangle's corners and a thinning fluid's axis, where velocities are less smooth, take a little.
    assert np.all(orders[1:] > 3.5)
    assert np.all(orders[1:] < 4.3)


@pytest.mark.parametrize("fluid", [name for name, fluid in FLUIDS.items() if not fluid.yield_stress])
@pytest.mark.parametrize("name", ["square", "ellipse", "eccentric annulus"])
def test_newton_steps_do_not_grow(name, fluid):
    first, *finer = uniform_levels(name, fluid)
    assert max(iterate.stress_steps for iterate in finer) <= max(first.stress_steps, 2)
    assert max(iterate.velocity.steps for iterate in finer) <= first.velocity.steps


@pytest.mark.parametrize("fluid", ["Bingham", "Herschel-Bulkley"])
@pytest.mark.parametrize("name", ["square", "ellipse", "eccentric annulus"])
def test_newton_steps_stay_few_where_yield_surfaces_cross_the_mesh(name, fluid):
    """They grow a little, for finer triangles see more of the kink."""
    for iterate in uniform_levels(name, fluid):
        assert iterate.stress_steps <= 15
        assert iterate.velocity.steps <= 20


@pytest.mark.parametrize("fluid", ["n = 0.5", "Carreau", "Bingham", "Herschel-Bulkley"])
@pytest.mark.parametrize("name", ["square", "eccentric annulus"])
def test_picard_gives_the_same_answer_in_more_steps(name, fluid):
    gradient = 2.0
    newton, picard = (
        solve(SECTIONS[name], FLUIDS[fluid], pressure_gradient=gradient, accuracy=0.003, method=method)
        for method in ("newton", "picard")
    )
    assert newton.status is picard.status is Status.ANSWERED
    assert picard.flow_rate == pytest.approx(newton.flow_rate, rel=5e-4)
    assert picard.flow_rate_bracket[0] <= newton.flow_rate_bracket[1]
    assert newton.flow_rate_bracket[0] <= picard.flow_rate_bracket[1]
    assert total_steps(picard) > total_steps(newton)


def total_steps(flow):
    return sum(record.stress_steps for record in flow.history)


@pytest.mark.parametrize("name", SECTIONS)
def test_local_gaps_add_up_and_are_not_negative(name):
    for fluid in FLUIDS:
        iterate = uniform_levels(name, fluid)[2]
        gap = iterate.bracket.gap
        assert np.sum(gap) == pytest.approx(iterate.bracket.width, rel=0.02)
        assert np.all(gap >= -1e-3 * iterate.bracket.width / len(gap))
