"""Reynolds numbers of a duct flow, and whether it can be expected to be laminar."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

import numpy as np

from ductsolve.post.factors import ShapeFactors, shape_factors
from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.flow import DuctFlow

PIPE_LIMIT = 2100.0  # end of laminar flow of a Newtonian fluid in a pipe (common practice, no source)


class Outlook(Enum):
    """Whether laminar flow is to be expected; every answer of ductsolve supposes that it is."""

    LAMINAR = "laminar flow is to be expected"
    DOUBTFUL = "laminar flow is doubtful"
    TURBULENT = "laminar flow is not to be expected"


@dataclass(frozen=True)
class TangentLaw:
    """Power law that touches a flow curve.

    Attributes
    ----------
    index, consistency : of the power law [-], [Pa.s^index]
    stress, rate : where it touches [Pa], [1/s]
    whole_curve : True where the flow curve is that power law itself
    """

    index: float
    consistency: float
    stress: float
    rate: float
    whole_curve: bool


@dataclass(frozen=True)
class Regime:
    """Reynolds numbers and what they mean.

    Attributes
    ----------
    generalised : Kozicki's Reynolds number, None where the mean wall shear stress does not exceed the
        yield stress and no power law touches the flow curve there
    friction : 8 density mean_velocity^2 / mean wall shear stress, which makes the Fanning friction
        factor of this very solution 16 / friction
    law : the power law behind ``generalised``
    factors : the shape factors behind it
    limits : Reynolds number up to which flow is laminar, by each of three rules
    outlook : what follows
    """

    generalised: float | None
    friction: float
    law: TangentLaw | None
    factors: ShapeFactors
    limits: dict[str, float]
    outlook: Outlook


def regime(flow: DuctFlow, density: float) -> Regime:
    """Reynolds numbers of a flow that moves, for a density [kg/m3]."""
    section, mean = flow.section, flow.mean_velocity
    stress = flow.pressure_gradient * section.hydraulic_diameter / 4
    law, factors = tangent_law(flow.fluid, stress), shape_factors(section)
    generalised, limits = None, {"common practice": PIPE_LIMIT}
    if law is not None:
        generalised = generalised_reynolds(law, factors, density, mean, section.hydraulic_diameter)
        limits["Mishra and Tripathi"] = mishra_tripathi_limit(law.index)
        limits["Ryan and Johnson"] = ryan_johnson_limit(law.index)
    friction = 8 * density * mean**2 / stress
    reached = friction if generalised is None else generalised
    return Regime(generalised, friction, law, factors, limits, _outlook(reached, limits))


def tangent_law(fluid: Fluid, stress: float) -> TangentLaw | None:
    """Power law that touches the flow curve at a shear stress [Pa], None up to the yield stress."""
    rate = float(fluid.rate(np.array(stress)))
    index = float(fluid.local_exponent(np.array(rate))) if rate > 0 else 0.0
    if index <= 0:
        return None
    return TangentLaw(index, stress / rate**index, stress, rate, fluid.power_index is not None)


def generalised_reynolds(
    law: TangentLaw, factors: ShapeFactors, density: float, mean_velocity: float, diameter: float
) -> float:
    """Kozicki's Reynolds number, rho U^(2-n) Dh^n / [8^(n-1) K (b + a/n)^n].

    Kozicki, Chou & Tiu, Chem. Eng. Sci. 21 (1966) 665. For a circle it is Metzner & Reed's, for a
    Newtonian fluid rho U Dh/viscosity x 16/(f Re), so that f = 16/Re in every section.
    """
    n = law.index
    inertia = density * mean_velocity ** (2 - n) * diameter**n
    return inertia / (8 ** (n - 1) * law.consistency * (factors.b + factors.a / n) ** n)


def mishra_tripathi_limit(index: float) -> float:
    """2100 (4n + 2)(5n + 3)/[3 (3n + 1)^2]: Mishra & Tripathi, Trans. Inst. Chem. Eng. 49 (1971) T141."""
    return PIPE_LIMIT * (4 * index + 2) * (5 * index + 3) / (3 * (3 * index + 1) ** 2)


def ryan_johnson_limit(index: float) -> float:
    """6464 n (n + 2)^((n + 2)/(n + 1))/(3n + 1)^2: Ryan & Johnson, AIChE J. 5 (1959) 433."""
    return 6464 * index * (index + 2) ** ((index + 2) / (index + 1)) / (3 * index + 1) ** 2


def _outlook(reached: float, limits: dict[str, float]) -> Outlook:
    """Laminar below every limit, not laminar above them all, doubtful between."""
    if reached < min(limits.values()):
        return Outlook.LAMINAR
    return Outlook.DOUBTFUL if reached <= max(limits.values()) else Outlook.TURBULENT
