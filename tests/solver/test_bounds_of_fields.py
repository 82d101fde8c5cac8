"""Bounds on the potential hold for any balanced stress and any velocity, however bad.

On straight triangles both fields' slopes are linear, and the integral of a convex function of them lies
between the rule of the centroids (Jensen) and the rule of the corners, on any subdivision. So the bounds that
the solver reads off its fields can be proved right, or wrong, without knowing the flow.
"""

from __future__ import annotations

import exact_flows as exact
import numpy as np
import pytest
from exact_flows import LAWS
from hypothesis import given
from hypothesis import strategies as st
from random_flows import decades, modest, sheared
from solver_cases import SECTIONS, relaxed

from ductsolve.mesh.sections import circle, rectangle
from ductsolve.rheology.laws import PowerLaw
from ductsolve.solver.bracket import potential_bracket, safe_potential_bracket
from ductsolve.solver.quadratic import Elements, corner_rule

STRAIGHT = ["square", "slot", "triangle", "L", "one hole", "two holes"]
PARTS = 32  # each side of a triangle is cut into, for the rule of the centroids


def centroids():
    """Barycentric centroids (PARTS^2, 3) of the equal parts of a triangle."""
    i, j = (a.ravel() for a in np.meshgrid(np.arange(PARTS), np.arange(PARTS), indexing="ij"))
    upright = np.column_stack([i, j])[i + j < PARTS] + 1 / 3
    inverted = np.column_stack([i, j])[i + j < PARTS - 1] + 2 / 3
    rest = np.vstack([upright, inverted]) / PARTS
    return np.column_stack([1 - rest.sum(axis=1), rest])


CENTROIDS = centroids()


def never_above(function, corners, areas):
    """Integral of a convex function of a vector (2, n_triangles, 3) linear in each triangle, or less."""
    size = np.linalg.norm(corners @ CENTROIDS.T, axis=0)
    return float(function(size).mean(axis=1) @ areas)


def proved_limits(level, fluid, gradient, psi, velocity):
    """(low, high) that the bounds of these fields cannot lie inside of."""
    elements = Elements(level.mesh, corner_rule(0))
    areas = elements.weights.sum(axis=1)
    drive = gradient * float(np.sum(level.elements.unit_load * velocity))
    spent = never_above(fluid.potential, elements.gradient(velocity), areas)
    return drive - spent, never_above(fluid.complementary, gradient * level.stress(psi, elements), areas)


def disturbed(iterate, amount, seed):
    """The fields of an iterate with noise in every unknown: still balanced, still at rest at the walls."""
    level, rng = iterate.level, np.random.default_rng(seed)
    borders = 0 if level.cuts is None else level.cuts.shape[2]
    noise = level.stress_system.spread(rng.normal(size=level.stress_system.size + borders))
    psi = iterate.psi + amount * np.abs(iterate.psi).max() * noise
    shake = level.velocity_system.spread(rng.normal(size=level.velocity_system.size))
    return psi, iterate.velocity.local + amount * np.abs(iterate.velocity.local).max() * shake


def check(iterate, fluid, gradient, amount, seed):
    psi, velocity = disturbed(iterate, amount, seed) if amount else (iterate.psi, iterate.velocity.local)
    fields = (iterate.level, fluid, gradient, psi, velocity)
    fast = potential_bracket(*fields)
    safe_low, safe_high = safe_potential_bracket(*fields)
    low, high = proved_limits(*fields)
    rounding = 1e-12 * (abs(safe_low) + safe_high)
    assert safe_low <= low + rounding
    assert safe_high >= high - rounding
    width = safe_high - safe_low
    # The fast bounds are widened by what two rules differ by: on coarse meshes, a little more than safe ones.
    assert fast.low >= safe_low - 0.03 * width
    assert fast.high <= safe_high + 0.03 * width
    # Never tighter than the fields allow.
    assert fast.low <= low + rounding, f"low by {(fast.low - low) / width:.1e} of the bracket's width"
    assert fast.high >= high - rounding, f"high by {(high - fast.high) / width:.1e} of the bracket's width"
    return fast


def stressed(name, law):
    """Gradient at which the mean wall stress shears a law of the table."""
    stress = law.yield_stress / 0.4 if law.yield_stress else 1.0
    return 4 * stress / SECTIONS[name].hydraulic_diameter


@pytest.mark.parametrize("levels", [1, 3])
@pytest.mark.parametrize("law", LAWS)
@pytest.mark.parametrize("name", STRAIGHT)
def test_fields_of_the_solver(name, law, levels):
    fluid, gradient = LAWS[law], stressed(name, LAWS[law])
    iterate = relaxed(SECTIONS[name], fluid, gradient, levels)
    solved = check(iterate, fluid, gradient, 0.0, 0)
    for amount in (1e-3, 0.03, 0.3):
        worse = check(iterate, fluid, gradient, amount, 7)
        # Bounds of the same potential: any low one below any high one.
        assert worse.low <= solved.high
        assert worse.high >= solved.low


@modest(60)
@given(
    st.sampled_from(STRAIGHT),
    sheared(largest_share=0.7),
    st.integers(1, 3),
    decades(-4, 0),
    st.integers(0, 99),
)
def test_random_fluids_and_disturbances(name, drawn, levels, amount, seed):
    fluid, stress = drawn
    gradient = 4 * stress / SECTIONS[name].hydraulic_diameter
    iterate = relaxed(SECTIONS[name], fluid, gradient, levels)
    check(iterate, fluid, gradient, 0.0, seed)
    check(iterate, fluid, gradient, amount, seed)


@pytest.mark.parametrize("index", [0.1, 0.2, 0.5, 1.0, 2.0])
@pytest.mark.parametrize("aspect", [1.0, 0.25])
def test_disturbed_fields_bracket_the_published_potential(aspect, index):
    """A power law's potential is n/(n + 1) G Q."""
    section, fluid = rectangle(1.0, aspect), PowerLaw(1.0, index)
    flow, doubt = exact.published_rectangle_flow(1.0, aspect, 1.0, index, 1.0)
    potential = index / (index + 1) * flow
    iterate = relaxed(section, fluid, 1.0, 3)
    for seed, amount in enumerate((0.0, 1e-4, 1e-3, 1e-2, 0.1, 1.0)):
        fields = (iterate.level, fluid, 1.0, *disturbed(iterate, amount, seed))
        bracket = potential_bracket(*fields)
        for low, high in ((bracket.low, bracket.high), safe_potential_bracket(*fields)):
            assert 4 * low <= potential * (1 + doubt + 1e-9)
            assert 4 * high >= potential * (1 - doubt - 1e-9)


@pytest.mark.parametrize("law", LAWS)
def test_disturbed_fields_bracket_the_potential_of_a_tube(law):
    """Curved walls: with the allowance for them."""
    fluid = LAWS[law]
    section, gradient = circle(2.0), stressed("circle", fluid)
    known = exact.tube_potential(fluid, 2.0, gradient)
    for levels in (1, 3):
        iterate = relaxed(section, fluid, gradient, levels)
        for seed, amount in enumerate((0.0, 1e-4, 1e-2, 0.3)):
            bracket = potential_bracket(iterate.level, fluid, gradient, *disturbed(iterate, amount, seed))
            assert len(section.copies) * bracket.low <= known * (1 + 1e-9)
            assert len(section.copies) * bracket.high >= known * (1 - 1e-9)
