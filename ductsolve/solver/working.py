"""Shear rates at which a flow does its work, and whether a tabulated flow curve covers them."""

from __future__ import annotations

import numpy as np

from ductsolve.solver.fields import size
from ductsolve.solver.flow import DuctFlow
from ductsolve.solver.quadratic import Elements, gauss

IDLE_SHARE = 0.01  # of the dissipated power: shear rates below these contribute nothing worth a warning
TOP_SHARE = 0.001  # ... and above these lie only re-entrant corners, where the rate is unbounded


def working_rates(flow: DuctFlow) -> np.ndarray:
    """Shear rates [1/s] at which all but a hundredth of the power is dissipated, rising."""
    elements = Elements(flow.level.mesh, gauss(3))
    stress = flow.pressure_gradient * size(flow.level.stress(flow.psi, elements)).ravel()
    rate = np.asarray(flow.fluid.rate(stress))
    order = np.argsort(rate)
    power = np.cumsum((rate * stress * elements.weights.ravel())[order])
    kept = (power >= IDLE_SHARE * power[-1]) & (power <= (1 - TOP_SHARE) * power[-1])
    return rate[order][kept]


def beyond_table(flow: DuctFlow) -> str | None:
    """How far a tabulated flow curve is extrapolated, as a sentence; None where it is not."""
    reach = getattr(flow.fluid, "reach", None)
    beyond = reach(working_rates(flow)) if reach is not None and flow.flow_rate > 0 else None
    return beyond and f"{beyond}; what lies outside is extrapolated at the end slopes"
