"""A flow curve given point by point."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any, ClassVar

import numpy as np

from ductsolve.errors import FluidError
from ductsolve.rheology.curve import LEAST_RATE, Curve
from ductsolve.rheology.energy import EnergyShare
from ductsolve.rheology.fluid import Array
from ductsolve.rheology.piecewise import Piecewise, hermite

# Flatter pieces are a plateau, from which the rate could not be told; steeper ones are scatter.
LEAST_EXPONENT, LARGEST_EXPONENT = 1e-3, 5.0

# An end slope is at least this part of the last piece's, whatever the curvature there.
_LEAST_END = 0.5

# Pieces between points are cut until neither ln(rate) nor ln(stress) changes by more than this in one,
# and into this many at least.
_LONGEST_STEP, _FEWEST_STEPS = 0.2, 8

# Rates this close to a point, relatively, stand for its two sides; points this close are one.
_SIDE, _SAME = 1e-9, 1e-6


@dataclass(frozen=True, eq=False)
class FlowCurve(Curve):
    """Measured or computed points of a flow curve.

    ln(stress) is a monotone piecewise cubic of ln(rate) through the points (Fritsch & Butland 1984),
    and a power law beyond either end, of the slope there. Points may come in any order.

    Attributes
    ----------
    shear_rate : (n_points,) [1/s], kept in rising order
    shear_stress : (n_points,) [Pa]
    """

    law_name: ClassVar[str] = "flow curve"
    yield_stress: ClassVar[float] = 0.0

    shear_rate: Array
    shear_stress: Array

    def __post_init__(self) -> None:
        rate, stress = _column("shear_rate", self.shear_rate), _column("shear_stress", self.shear_stress)
        if rate.size != stress.size:
            raise _error(f"shear_rate has {rate.size} values, shear_stress {stress.size}; give pairs")
        if rate.size < 2:
            raise _error(f"found {rate.size} point; give at least two")
        order = np.argsort(rate, kind="stable")
        rate, stress = rate[order], stress[order]
        _check_rising(rate, stress)
        for name, values in (("shear_rate", rate), ("shear_stress", stress)):
            values.flags.writeable = False
            object.__setattr__(self, name, values)

    @property
    def exponent_bound(self) -> float:
        """Largest slope of ln(stress): at a point, or at the top of a piece's parabola."""
        cube, square, slope, _ = self._log_stress.coefficients[:, 1:-1]
        with np.errstate(all="ignore"):
            top = -square / (3.0 * cube)
            inside = (top > 0.0) & (top < np.diff(np.log(self.shear_rate)))
        peaks = (slope + square * top)[inside]
        return float(max(self._log_stress.coefficients[2].max(), peaks.max(initial=0.0)))

    @cached_property
    def knots(self) -> Array:
        return np.exp(self._edges)

    @property
    def samples(self) -> Array:
        sides = np.array([[1.0 - _SIDE], [1.0 + _SIDE]])
        return np.sort((self.knots * sides).ravel())

    def terms(self, rate: Array) -> tuple[Array, Array, Array]:
        rate = np.asarray(rate, dtype=float)
        place = self._log_stress.locate(np.log(np.maximum(rate, LEAST_RATE)))
        exponent, change = self._slope.at(*place), self._bend.at(*place)
        stress = np.where(rate == 0.0, 0.0, np.exp(self._log_stress.at(*place)))
        return stress, stress * exponent, stress * (exponent * exponent + change)

    def potential(self, rate: Array) -> Array:
        share, product = self._energy(rate)
        return product * share

    def complementary_at(self, rate: Array) -> Array:
        share, product = self._energy(rate)
        return product * (1.0 - share)

    def reach(self, rates: Array) -> str | None:
        """How far shear rates [1/s] leave the table, as a sentence; None where they stay inside.

        Rates of 0 are left out: every duct flow has some.
        """
        rates = np.asarray(rates, dtype=float)
        rates = rates[rates > 0.0]
        if rates.size == 0:
            return None
        first, last = self.shear_rate[0], self.shear_rate[-1]
        beyond = []
        if rates.min() < first:
            beyond.append(
                f"down to {rates.min():.3g} 1/s, {first / rates.min():.3g} times below its first point"
            )
        if rates.max() > last:
            beyond.append(f"up to {rates.max():.3g} 1/s, {rates.max() / last:.3g} times above its last point")
        if not beyond:
            return None
        return f"the flow curve is used {' and '.join(beyond)} ({first:.3g} to {last:.3g} 1/s was given)"

    def describe(self) -> tuple[tuple[str, float, str], ...]:
        """(label, value, SI unit text) of the number of points and of the first and last one."""
        return (
            ("number of points", float(self.shear_rate.size), "-"),
            ("first shear rate", float(self.shear_rate[0]), "1/s"),
            ("last shear rate", float(self.shear_rate[-1]), "1/s"),
            ("first shear stress", float(self.shear_stress[0]), "Pa"),
            ("last shear stress", float(self.shear_stress[-1]), "Pa"),
        )

    def _energy(self, rate: Array) -> tuple[Array, Array]:
        rate = np.asarray(rate, dtype=float)
        return self._share(np.log(np.maximum(rate, LEAST_RATE))), rate * self.stress(rate)

    @cached_property
    def _log_stress(self) -> Piecewise:
        x, y = np.log(self.shear_rate), np.log(self.shear_stress)
        return hermite(x, y, monotone_slopes(x, y))

    @cached_property
    def _slope(self) -> Piecewise:
        return self._log_stress.derivative()

    @cached_property
    def _bend(self) -> Piecewise:
        return self._slope.derivative()

    @cached_property
    def _edges(self) -> Array:
        """ln(rate) at the points and between them, in steps fine enough to tabulate on."""
        x, y = np.log(self.shear_rate), np.log(self.shear_stress)
        steps = np.maximum(np.diff(x), np.diff(y)) / _LONGEST_STEP
        steps = np.maximum(np.ceil(steps), _FEWEST_STEPS).astype(int)
        within = [
            np.linspace(*ends, n, endpoint=False) for *ends, n in zip(x[:-1], x[1:], steps, strict=True)
        ]
        return np.concatenate((*within, x[-1:]))

    @cached_property
    def _share(self) -> EnergyShare:
        slopes = self._log_stress.coefficients[2]
        return EnergyShare(self._log_stress, self._edges, slopes[0], slopes[-1])


def monotone_slopes(x: Array, y: Array) -> Array:
    """Slopes (n,) of a cubic that rises with rising points.

    Inside: the weighted harmonic mean of Fritsch & Butland, SIAM J. Sci. Stat. Comput. 5 (1984) 300.
    At the ends: the parabola's through three points, kept near the slope of the last piece.
    """
    width, secant = np.diff(x), np.diff(y) / np.diff(x)
    if secant.size == 1:
        return np.repeat(secant, 2)
    before, after = 2.0 * width[1:] + width[:-1], width[1:] + 2.0 * width[:-1]
    inside = (before + after) / (before / secant[:-1] + after / secant[1:])
    ends = [_end_slope(width[:2], secant[:2]), _end_slope(width[:-3:-1], secant[:-3:-1])]
    return np.concatenate((ends[:1], inside, ends[1:]))


def _end_slope(width: Array, secant: Array) -> float:
    """Slope at an end from the first two pieces seen from it."""
    parabola = secant[0] + width[0] / (width[0] + width[1]) * (secant[0] - secant[1])
    return min(max(parabola, _LEAST_END * secant[0]), LARGEST_EXPONENT)


def _column(name: str, values: Sequence[float] | Any) -> Array:
    try:
        column = np.array(values)
    except ValueError:
        column = np.array(None)
    if column.ndim != 1 or (column.size and column.dtype.kind not in "iuf"):
        raise _error(f"{name} is not one column of numbers; give a list such as [1.0, 10.0, 100.0]")
    column = column.astype(float)
    wrong = np.flatnonzero(~((column > 0.0) & np.isfinite(column)))
    if wrong.size:
        raise _error(
            f"{name} of point {wrong[0] + 1} is {column[wrong[0]]:g}; give a finite number above 0, or leave "
            "the point out"
        )
    return column


def _check_rising(rate: Array, stress: Array) -> None:
    for value in rate[1:][np.diff(rate) <= _SAME * rate[1:]]:
        raise _error(f"shear_rate {value:g} 1/s is given twice; average the two points")
    exponent = np.diff(np.log(stress)) / np.diff(np.log(rate))
    for k in np.flatnonzero((exponent < LEAST_EXPONENT) | (exponent > LARGEST_EXPONENT)):
        change = f"shear_stress goes from {stress[k]:g} to {stress[k + 1]:g} Pa"
        over = f"as shear_rate rises from {rate[k]:g} to {rate[k + 1]:g} 1/s"
        if exponent[k] <= 0.0:
            raise _error(f"{change} {over}; a flow curve must rise: leave out or average these points")
        raise _error(
            f"{change} {over}, an exponent of {exponent[k]:.2g}; leave out or average points until it is "
            f"from {LEAST_EXPONENT:g} to {LARGEST_EXPONENT:g}"
        )


def _error(message: str) -> FluidError:
    return FluidError(f"flow curve: {message}")
