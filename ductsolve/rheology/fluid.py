"""What a fluid is to the solver: one rising flow curve, stress against shear rate."""

from __future__ import annotations

from typing import Protocol

import numpy as np

Array = np.ndarray


class Fluid(Protocol):
    """Contract of a flow curve.

    Every method takes and returns an array of any shape (a scalar is accepted) of
    non-negative numbers, and is exact to rounding wherever the curve has a closed form.

    1. ``stress`` rises with the rate; its limit at zero rate is ``yield_stress``.
    2. ``rate`` inverts it and is 0 up to the yield stress.
    3. ``potential`` F is the integral of the stress over the rate from 0.
    4. ``complementary`` F* is the integral of the rate over the stress from 0, so
       F(rate) + F*(stress) >= rate * stress, with equality on the curve.
    5. ``rate_slope`` is d(rate)/d(stress): 0 up to a yield stress; at stress 0 of a fluid without
       one it is the slope there, which a thickening power law has infinite.
    6. ``local_exponent`` is d ln(stress)/d ln(rate) and lies in [0, ``exponent_bound``] everywhere.
    7. ``power_index`` is the index of a fluid known to be a pure power law, None for any other.
    8. NaN gives NaN, save in a slope or exponent that is constant; nothing warns.
    """

    yield_stress: float
    exponent_bound: float
    power_index: float | None

    def stress(self, rate: Array) -> Array:
        """Shear stress [Pa] at shear rate [1/s]."""

    def rate(self, stress: Array) -> Array:
        """Shear rate [1/s] at shear stress [Pa]."""

    def potential(self, rate: Array) -> Array:
        """Dissipation potential F [Pa/s] at shear rate [1/s]."""

    def complementary(self, stress: Array) -> Array:
        """Complementary potential F* [Pa/s] at shear stress [Pa]."""

    def rate_slope(self, stress: Array) -> Array:
        """Slope of the inverse curve [1/(Pa s)] at shear stress [Pa]."""

    def local_exponent(self, rate: Array) -> Array:
        """Local exponent d ln(stress)/d ln(rate) [-] at shear rate [1/s]."""

    def tilted(self, tilt: float, index: float) -> Fluid:
        """Fluid of the curve stress + tilt (stress - rate stress'/index).

        Raises ``FluidError`` when the tilted curve does not rise everywhere.
        """
