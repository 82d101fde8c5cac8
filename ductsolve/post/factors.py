"""What the shape of a section does to a laminar flow: numbers that hold for every fluid and size."""

from __future__ import annotations

from dataclasses import dataclass

from ductsolve.mesh.sections import Section
from ductsolve.rheology.laws import Newtonian
from ductsolve.solver.solve import solve

FACTOR_ACCURACY = 1e-4  # guaranteed on f Re; the best estimate used is closer


@dataclass(frozen=True)
class ShapeFactors:
    """Shape factors of a section, from the Newtonian flow through it.

    Attributes
    ----------
    friction : Fanning friction factor x Reynolds number, gradient Dh^2/(2 viscosity x mean velocity)
    peak : largest over mean velocity
    """

    friction: float
    peak: float

    @property
    def a(self) -> float:
        """Kozicki's a: 1/4 for a circle, 1/2 for a slot."""
        return self.friction / (32 * self.peak)

    @property
    def b(self) -> float:
        """Kozicki's b: 3/4 for a circle, 1 for a slot."""
        return self.friction / 16 - self.a


def shape_factors(section: Section) -> ShapeFactors:
    """Work the shape factors out by a Newtonian solve of the same section.

    In a Newtonian flow the shear rate at the wall is 8 (a + b) U/Dh on average, and the velocity profile
    is as blunt as 2 a says (Kozicki, Chou & Tiu, Chem. Eng. Sci. 21 (1966) 665).
    """
    flow = solve(section, Newtonian(1.0), pressure_gradient=1.0, accuracy=FACTOR_ACCURACY)
    diameter, mean = section.hydraulic_diameter, flow.mean_velocity
    return ShapeFactors(friction=diameter**2 / (2 * mean), peak=flow.max_velocity / mean)
