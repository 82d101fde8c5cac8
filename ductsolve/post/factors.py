"""What the shape of a section does to a laminar flow: numbers that hold for every fluid and size."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.mesh.sections import Section
from ductsolve.rheology.laws import Newtonian
from ductsolve.solver.flow import DuctFlow
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
    return ShapeFactors(friction=diameter**2 / (2 * mean), peak=peak_velocity(flow) / mean)


def peak_velocity(flow: DuctFlow) -> float:
    """Largest velocity anywhere [m/s]: at a node, or where the quadratic between nodes peaks."""
    local = flow.velocity_field
    sides = (_side_peak(local[:, i], local[:, 3 + i], local[:, (i + 1) % 3]) for i in range(3))
    return float(max(local.max(), _inner_peak(local), *sides))


def _side_peak(start, middle, end):
    """Largest value of parabolas along a side inside it, 0 where none peaks there."""
    slope, bend = (end - start) / 2, start - 2 * middle + end
    inside = (bend < 0) & (np.abs(slope) <= -bend)
    return (middle - np.divide(slope**2, 2 * bend, out=np.zeros_like(bend), where=inside))[inside].max(
        initial=0.0
    )


def _inner_peak(local):
    """Largest stationary value of quadratics (n, 6) inside their reference triangles, 0 without any."""
    w0, w1, w2, w3, w4, w5 = local.T
    gradient = np.stack([4 * w3 - 3 * w0 - w1, 4 * w5 - 3 * w0 - w2])
    along, across = 4 * (w0 + w1 - 2 * w3), 4 * (w0 + w2 - 2 * w5)
    mixed = 4 * (w0 - w3 + w4 - w5)
    determinant = along * across - mixed**2
    peaked = (determinant > 0) & (along < 0)
    determinant = np.where(peaked, determinant, 1.0)
    x = (mixed * gradient[1] - across * gradient[0]) / determinant
    y = (mixed * gradient[0] - along * gradient[1]) / determinant
    inside = peaked & (x >= 0) & (y >= 0) & (x + y <= 1)
    return (w0 + (gradient[0] * x + gradient[1] * y) / 2)[inside].max(initial=0.0)
