"""Duties that cannot be answered are refused in one line that names what is wrong."""

from __future__ import annotations

import math

import numpy as np
import pytest

from ductsolve.errors import DuctsolveError, DutyError, SectionError
from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle
from ductsolve.rheology.laws import Newtonian, PowerLaw
from ductsolve.solver.solve import solve

SECTION, FLUID = circle(1.0), Newtonian(1.0)
NO_NUMBER = [math.nan, math.inf, -math.inf, 0.0, -1.0, True, "1", [1.0], 1j, np.array([1.0, 2.0])]


def refused(error, *words, **duty):
    with pytest.raises(error) as caught:
        solve(SECTION, FLUID, **duty)
    text = str(caught.value)
    assert isinstance(caught.value, DuctsolveError)
    assert "\n" not in text
    for word in words:
        assert word in text


def test_both_duties():
    refused(DutyError, "exactly one", "both", pressure_gradient=1.0, flow_rate=1.0)


def test_neither_duty():
    refused(DutyError, "exactly one", "neither")


@pytest.mark.parametrize("value", NO_NUMBER, ids=repr)
@pytest.mark.parametrize("name", ["pressure_gradient", "flow_rate"])
def test_a_duty_must_be_a_positive_number(name, value):
    refused(DutyError, name, "positive", **{name: value})


@pytest.mark.parametrize("value", [*NO_NUMBER, 1e-9, 1.0, 2.0, None], ids=repr)
def test_an_accuracy_must_be_a_share(value):
    refused(DutyError, "accuracy", "between", pressure_gradient=1.0, accuracy=value)


@pytest.mark.parametrize("value", ["", "Newton", "newton ", None, 1], ids=repr)
def test_a_method_must_be_known(value):
    refused(DutyError, "method", "newton", "picard", pressure_gradient=1.0, method=value)


@pytest.mark.parametrize("value", [0, -5, math.nan, "many"], ids=repr)
def test_a_triangle_budget_must_be_positive(value):
    refused(DutyError, "triangle_budget", pressure_gradient=1.0, triangle_budget=value)


@pytest.mark.parametrize("number", [np.float64(2.0), np.float32(2.0), np.int64(2), 2, 2.0], ids=repr)
def test_numbers_of_any_kind_are_taken(number):
    flow = solve(SECTION, FLUID, pressure_gradient=number)
    assert flow.flow_rate == solve(SECTION, FLUID, pressure_gradient=2.0).flow_rate


@pytest.mark.parametrize("section", ["circle", None, 3.0, circle])
def test_a_section_must_be_one(section):
    with pytest.raises(DuctsolveError, match="section"):
        solve(section, FLUID, pressure_gradient=1.0)


@pytest.mark.parametrize("fluid", ["water", None, 1.0])
def test_a_fluid_must_be_one(fluid):
    with pytest.raises(DuctsolveError, match="fluid"):
        solve(SECTION, fluid, pressure_gradient=1.0)


SECTIONS = {
    "negative width": (lambda: rectangle(-1.0, 1.0), "width"),
    "zero height": (lambda: rectangle(1.0, 0.0), "height"),
    "NaN diameter": (lambda: circle(math.nan), "diameter"),
    "text": (lambda: ellipse("1", 1.0), "width"),
    "infinite": (lambda: ellipse(1.0, math.inf), "height"),
    "pipe larger than hole": (lambda: annulus(0.1, 0.12), "0.1 m must exceed inner_diameter 0.12"),
    "pipe as large as hole": (lambda: annulus(0.1, 0.1), "must exceed"),
    "negative pipe": (lambda: annulus(0.1, -0.05), "inner_diameter"),
    "eccentricity above 1": (lambda: annulus(0.2, 0.1, 1.2), "eccentricity 1.2"),
    "eccentricity below 0": (lambda: annulus(0.2, 0.1, -0.1), "eccentricity -0.1"),
    "NaN eccentricity": (lambda: annulus(0.2, 0.1, math.nan), "eccentricity"),
    "two corners": (lambda: polygon([(0, 0), (1, 1)]), "three corners"),
    "crossing": (lambda: polygon([(0, 0), (1, 1), (1, 0), (0, 1)]), "crosses"),
    "no area": (lambda: polygon([(0, 0), (1, 1), (2, 2)]), "no area"),
    "hole outside": (lambda: polygon([(0, 0), (1, 0), (0, 1)], [[(5, 5), (6, 5), (5, 6)]]), "outside"),
}


@pytest.mark.parametrize("name", SECTIONS)
def test_sections_that_cannot_be(name):
    make, words = SECTIONS[name]
    with pytest.raises(SectionError) as caught:
        make()
    assert words in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    "duty",
    [
        {"pressure_gradient": 1e-300},
        {"pressure_gradient": 1e300},
        {"flow_rate": 1e-300},
        {"flow_rate": 1e300},
    ],
)
def test_shear_rates_beyond_numbers_are_refused(duty):
    with pytest.raises(DutyError, match="shear rates too (small|large) for numbers"):
        solve(circle(0.02), PowerLaw(1.0, 0.5), **duty)
