"""Flows in closed form, or by quadrature of a fluid's shear rate, for comparison with the solver."""

from __future__ import annotations

import math

import numpy as np
from published_data import row
from scipy.optimize import brentq

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
from ductsolve.rheology.tabulated import FlowCurve

# All laws, with parameters of the order of 1 so that a stress of the order of 1 shears them.
LAWS = {
    "Newtonian": Newtonian(0.8),
    "power law 0.1": PowerLaw(0.7, 0.1),
    "power law 0.2": PowerLaw(0.7, 0.2),
    "power law 0.5": PowerLaw(0.7, 0.5),
    "power law 1.5": PowerLaw(0.7, 1.5),
    "power law 2": PowerLaw(0.7, 2.0),
    "Bingham": Bingham(0.3, 0.5),
    "Herschel-Bulkley 0.5": HerschelBulkley(0.3, 0.5, 0.5),
    "Herschel-Bulkley 1.3": HerschelBulkley(0.3, 0.5, 1.3),
    "Casson": Casson(0.2, 0.4),
    "Carreau": CarreauYasuda(5.0, 0.0, 6.0, 0.5),
    "Carreau-Yasuda": CarreauYasuda(5.0, 0.02, 6.0, 0.3, 0.8),
    "Cross": Cross(5.0, 0.02, 6.0, 0.7),
    "Ellis": Ellis(4.0, 0.3, 2.5),
    "Sisko": Sisko(0.1, 0.6, 0.4),
    "Robertson-Stiff": RobertsonStiff(0.5, 0.6, 0.3),
    "flow curve": FlowCurve([0.01, 0.1, 1.0, 10.0, 100.0], [0.05, 0.2, 0.7, 2.0, 6.0]),
}


# Gauss points on panels that shrink towards both ends of (0, 1), where integrands may be singular.
_HALF = 0.5 * 0.85 ** np.arange(170)[::-1]
_EDGES = np.concatenate([[0.0], _HALF, 1 - _HALF[-2::-1], [1.0]])
_GAUSS = np.polynomial.legendre.leggauss(8)
_POINTS = (_EDGES[:-1, None] + np.diff(_EDGES)[:, None] * (_GAUSS[0] + 1) / 2).ravel()
_WEIGHTS = (np.diff(_EDGES)[:, None] * _GAUSS[1] / 2).ravel()


def integral(function, low, high):
    """Integral of a vectorised function, to about ten digits; 0 over nothing."""
    if high <= low:
        return 0.0
    return float((high - low) * (_WEIGHTS @ function(low + (high - low) * _POINTS)))


def tube_flow(fluid, diameter, gradient):
    """Flow rate through a circle (Rabinowitsch 1929): (pi R^3/tau_w^3) int rate tau^2 dtau."""
    radius = diameter / 2
    wall = gradient * radius / 2
    return math.pi * (radius / wall) ** 3 * integral(lambda s: fluid.rate(s) * s**2, fluid.yield_stress, wall)


def tube_potential(fluid, diameter, gradient):
    """int F*(G r/2) over a circle: the potential that the solver brackets."""
    return integral(lambda r: 2 * math.pi * r * fluid.complementary(gradient * r / 2), 0.0, diameter / 2)


def slit_flow(fluid, gap, gradient):
    """Flow rate per unit width between parallel plates: (gap^2/(2 tau_w^2)) int rate tau dtau."""
    wall = gradient * gap / 2
    return (gap / wall) ** 2 / 2 * integral(lambda s: fluid.rate(s) * s, fluid.yield_stress, wall)


def annulus_flow(fluid, outer_diameter, inner_diameter, gradient):
    """Flow rate through a concentric annulus.

    The stress is G/2 (L^2/r - r); L follows from no slip at both walls, and Q = -pi int r^2 w' dr.
    """
    inner, outer = inner_diameter / 2, outer_diameter / 2

    def stress(r, square):
        return gradient / 2 * (square / r - r)

    def rate(r, square):
        return np.sign(stress(r, square)) * fluid.rate(np.abs(stress(r, square)))

    def both(function, square):
        """Integral of a function of r over the two sheared layers beside the plug (or the line L)."""
        band = 2 * fluid.yield_stress / gradient
        root = math.sqrt(band**2 + 4 * square)
        below, above = max((root - band) / 2, inner), min((root + band) / 2, outer)
        return integral(function, inner, below) + integral(function, above, outer)

    def slip(square):
        return both(lambda r: rate(r, square), square)

    thick = outer - inner
    square = brentq(slip, inner**2 + 1e-9 * thick, outer**2 - 1e-9 * thick, xtol=1e-15, rtol=1e-14)
    return -math.pi * both(lambda r: r**2 * rate(r, square), square)


def ellipse_flow(viscosity, width, height, gradient):
    """Newtonian: pi a^3 b^3 G/(4 mu (a^2 + b^2)) (Boussinesq 1868)."""
    a, b = width / 2, height / 2
    return math.pi * (a * b) ** 3 * gradient / (4 * viscosity * (a**2 + b**2))


def rectangle_flow(viscosity, width, height, gradient):
    """Newtonian: Boussinesq's (1868) series, 60 terms."""
    long, short = max(width, height), min(width, height)
    odd = np.arange(1, 120, 2)
    sum_ = np.sum(np.tanh(odd * math.pi * long / (2 * short)) / odd**5)
    return gradient * long * short**3 / (12 * viscosity) * (1 - 192 * short / (math.pi**5 * long) * sum_)


def equilateral_flow(viscosity, side, gradient):
    """Newtonian: sqrt(3) G s^4/(320 mu) (Boussinesq 1868)."""
    return math.sqrt(3) * gradient * side**4 / (320 * viscosity)


def mean_velocity(friction, hydraulic_diameter, consistency, index, gradient):
    """From a published friction f Re_K = G Dh^(n+1)/(2 K U^n)."""
    return (gradient * hydraulic_diameter ** (index + 1) / (2 * consistency * friction)) ** (1 / index)


def published_rectangle_flow(width, aspect, consistency, index, gradient):
    """Power law in a rectangle, from the table of f Re_K; and the relative error the table states."""
    found = row("B2_powerlaw_rectangle_fRe", aspect=aspect, n=index)
    hydraulic = 2 * width * aspect / (1 + aspect)
    velocity = mean_velocity(found["fRe_K"], hydraulic, consistency, index, gradient)
    return velocity * width**2 * aspect, found["err"] / found["fRe_K"] / index
