"""Inverse of a rising curve that has no closed inverse, exact to rounding."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ductsolve.rheology.fluid import Array
from ductsolve.rheology.piecewise import hermite

# Terms of a curve y(x): y, dy/d(ln x) and d2y/d(ln x)2, or None for the last.
Terms = Callable[[Array], tuple[Array, Array, "Array | None"]]

# A step in ln x no longer than this lands on the answer to rounding: Halley's leaves an error of its
# cube, Newton's of its square. No step crosses a kink: the first guess is exact at the knots.
_LAST_HALLEY, _LAST_NEWTON = 2e-6, 1e-8

_FAST_STEPS = 6

# Bisection ends at this width of ln x, above the rounding of the largest.
_NARROWEST = 1e-12

# Arguments outside exp(+-640) leave the range of numbers once powers are taken of them.
_LARGEST_LOG = 640.0


class Inverse:
    """x of a curve y(x) that rises from y(0) = 0 to infinity and is a power law beyond its knots.

    A cubic table of ln x against ln y gives the first guess, Halley's method in logarithms
    (Newton's without a second derivative) the answer; what has not settled after a few steps
    is bisected. NaN gives NaN.
    """

    def __init__(self, terms: Terms, knots: Array):
        with np.errstate(all="ignore"):
            y, slope, bend = terms(knots)
            log_x, log_y, log_slope = np.log(knots), np.log(y), y / slope
        rising = np.r_[True, np.diff(log_y) > 0.0]
        self._terms = terms
        self._last_step = _LAST_NEWTON if bend is None else _LAST_HALLEY
        self._guess = hermite(log_y[rising], log_x[rising], log_slope[rising])
        self._low, self._high = log_x[0] - 1.0, log_x[-1] + 1.0

    def __call__(self, y: Array) -> Array:
        y = np.asarray(y, dtype=float)
        inside = (y > 0.0) & (y < np.inf)
        if inside.all():
            return self._solve(y.ravel()).reshape(y.shape)[()]
        x = np.array(y)
        x[inside] = self._solve(y[inside])
        return x[()]

    def _solve(self, y: Array) -> Array:
        log_x = self._guess(np.log(y))
        with np.errstate(all="ignore"):
            x = np.exp(log_x)
            near = np.abs(log_x) < _LARGEST_LOG
            if near.all():
                return self._polish(y, x)
            x[near] = self._polish(y[near], x[near])
        return x

    def _polish(self, y: Array, x: Array) -> Array:
        for _ in range(_FAST_STEPS):
            step = self._step(y, x)
            x = x * np.exp(step)
            unsettled = ~(np.abs(step) <= self._last_step)
            if not unsettled.any():
                return x
        x[unsettled] = self._bisect(y[unsettled])
        return x

    def _step(self, y: Array, x: Array) -> Array:
        """Step in ln x towards y."""
        value, slope, bend = self._terms(x)
        inverse_exponent = value / slope
        log_ratio = np.log(y / value)
        newton = log_ratio * inverse_exponent
        if bend is None:
            return newton
        curvature = bend * inverse_exponent / slope - 1.0
        return newton / np.maximum(1.0 + 0.5 * log_ratio * curvature, 0.5)

    def _bisect(self, y: Array) -> Array:
        """Slow and sure, between the knots: beyond them the guess leaves nothing to do."""
        low, high = np.full_like(y, self._low), np.full_like(y, self._high)
        while np.any(high - low > _NARROWEST):
            middle = 0.5 * (low + high)
            below = self._terms(np.exp(middle))[0] < y
            low, high = np.where(below, middle, low), np.where(below, high, middle)
        x = np.exp(0.5 * (low + high))
        return x * np.exp(np.clip(self._step(y, x), -_NARROWEST, _NARROWEST))
