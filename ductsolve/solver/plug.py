"""What does not shear: proved, and apparent."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.fields import Level, size
from ductsolve.solver.quadratic import Elements, gauss, subdivided

SLOW = 0.01  # of the nominal shear rate 8 U / hydraulic diameter


@dataclass(frozen=True)
class Plug:
    """Unyielded parts of the section, as fractions of its area.

    Attributes
    ----------
    proved : certainly sheared more slowly than ``slow_rate``; no finite computation can prove rest
    apparent : where the computed stress is at most the yield stress
    slow_rate : shear rate the proof speaks of [1/s], 1 % of 8 mean velocity / hydraulic diameter
    """

    proved: float
    apparent: float
    slow_rate: float


def plug(level: Level, fluid: Fluid, gradient: float, psi: np.ndarray, gap: float, slow_rate: float) -> Plug:
    """Plug fractions from a balanced stress and the gap of its potential bracket [W/m].

    Where the balanced stress is at most yield_stress - m, a true shear rate above g adds at least
    F(g) - (yield_stress - m) g to the gap, for F rises faster than that line. So the area on which that
    happens is at most the gap over it; the best m counts.
    """
    if fluid.yield_stress == 0:
        return Plug(0.0, 0.0, slow_rate)
    if gap == 0:  # rest, proved
        return Plug(1.0, 1.0, slow_rate)
    elements = Elements(level.mesh, subdivided(gauss(2), 1))
    stress = gradient * size(level.stress(psi, elements)).ravel()
    weights = elements.weights.ravel()
    below = stress <= fluid.yield_stress
    order = np.argsort(stress[below])
    area = np.cumsum(weights[below][order])
    price = fluid.potential(slow_rate) - stress[below][order] * slow_rate
    sure = area - np.divide(gap, price, out=np.full_like(area, np.inf), where=price > 0)
    total = weights.sum()
    return Plug(
        float(max(sure.max(initial=0.0), 0.0) / total), float(weights[below].sum() / total), slow_rate
    )
