"""Fluids for the tests, each beside the plain textbook formula of its law."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np

from ductsolve.rheology.laws import (
    Bingham,
    CarreauYasuda,
    Casson,
    Cross,
    Ellis,
    HerschelBulkley,
    Newtonian,
    PowerLaw,
    RobertsonStiff,
    Sisko,
)


class Case(NamedTuple):
    """A fluid and the plain formula of its stress, or (Ellis) of its rate."""

    fluid: object
    stress: Callable | None
    rate: Callable | None = None


def newtonian(viscosity):
    return Case(Newtonian(viscosity), lambda g: viscosity * g)


def power_law(consistency, n):
    return Case(PowerLaw(consistency, n), lambda g: consistency * g**n)


def bingham(yield_stress, plastic):
    return Case(Bingham(yield_stress, plastic), lambda g: yield_stress + plastic * g)


def herschel_bulkley(yield_stress, consistency, n):
    law = HerschelBulkley(yield_stress, consistency, n)
    return Case(law, lambda g: yield_stress + consistency * g**n)


def casson(yield_stress, plastic):
    law = Casson(yield_stress, plastic)
    return Case(law, lambda g: (np.sqrt(yield_stress) + np.sqrt(plastic * g)) ** 2)


def carreau_yasuda(zero, infinite, time, n, a=2.0):
    law = CarreauYasuda(zero, infinite, time, n, a)
    return Case(law, lambda g: g * (infinite + (zero - infinite) * (1 + (time * g) ** a) ** ((n - 1) / a)))


def cross(zero, infinite, time, m):
    law = Cross(zero, infinite, time, m)
    return Case(law, lambda g: g * (infinite + (zero - infinite) / (1 + (time * g) ** m)))


def ellis(zero, half, a):
    law = Ellis(zero, half, a)
    return Case(law, None, lambda s: s / zero * (1 + (s / half) ** (a - 1)))


def sisko(infinite, consistency, n):
    return Case(Sisko(infinite, consistency, n), lambda g: infinite * g + consistency * g**n)


def robertson_stiff(consistency, n, shift):
    return Case(RobertsonStiff(consistency, n, shift), lambda g: consistency * (g + shift) ** n)


CASES = [
    newtonian(0.7),
    power_law(3.0, 0.4),
    power_law(0.2, 1.7),
    bingham(5.0, 0.03),
    bingham(0.0, 0.03),
    herschel_bulkley(4.0, 1.5, 0.35),
    herschel_bulkley(4.0, 0.02, 1.4),
    casson(9.3, 1.42),
    casson(0.0, 1.42),
    carreau_yasuda(8080.0, 0.0, 1.109, 0.304),
    carreau_yasuda(20.0, 0.01, 3.0, 0.2, 0.7),
    carreau_yasuda(5.0, 1.0, 0.1, 1.6),
    carreau_yasuda(1.0, 0.1, 2.0, 0.0),
    carreau_yasuda(50.0, 1e-3, 10.0, 0.1, 0.1),
    carreau_yasuda(50.0, 0.0, 0.02, 0.5, 9.0),
    cross(12.0, 0.0, 0.5, 0.8),
    cross(12.0, 0.3, 0.5, 1.2),
    cross(12.0, 9.0, 0.5, 4.0),
    ellis(30.0, 8.0, 2.4),
    ellis(30.0, 8.0, 15.0),
    ellis(30.0, 8.0, 1.0),
    sisko(0.02, 4.0, 0.3),
    sisko(0.5, 0.01, 1.8),
    sisko(0.0, 4.0, 0.3),
    sisko(0.5, 0.0, 0.3),
    robertson_stiff(1.2, 0.6, 7.0),
    robertson_stiff(0.01, 1.5, 40.0),
    robertson_stiff(1.2, 0.6, 0.0),
]

DECADES = np.logspace(-6.0, 6.0, 97)


def name(case):
    values = [f"{value:g}" for _, value, _ in case.fluid.describe()]
    return f"{type(case.fluid).__name__}({', '.join(values)})"


def plain_stress(case, rate):
    """Stress from the plain formula, or exactly the fluid's for the law that is given by its rate."""
    return case.stress(rate) if case.stress else case.fluid.stress(rate)


def share_above_yield(fluid, stress):
    """What rounding of the stress is multiplied by in the rate: digits are lost near the yield stress."""
    return (stress - fluid.yield_stress) / stress
