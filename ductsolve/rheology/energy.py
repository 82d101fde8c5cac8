"""Share of rate * stress that is potential, tabulated for curves whose integral has no closed form."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ductsolve.rheology.fluid import Array
from ductsolve.rheology.piecewise import Piecewise

# Degree of the polynomial in a piece: at the widths asked for, the first one left out is below rounding.
_DEGREE = 13
_NODES = -np.cos(np.pi * np.arange(_DEGREE + 1) / _DEGREE)
_POWERS = np.vander(_NODES)
_DROP = np.arange(_DEGREE + 1, 0, -1)


def _running_integral() -> Array:
    """Matrix from values at the nodes to integrals from -1 up to each node."""
    of_powers = (_NODES[:, None] ** _DROP - (-1.0) ** _DROP) / _DROP
    return np.linalg.solve(_POWERS.T, of_powers.T).T


_INTEGRAL = _running_integral()


class EnergyShare:
    """Potential / (rate * stress) as a function of ln(rate), to about 1e-14.

    Parameters
    ----------
    log_stress : function of ln(rate), smooth between the edges
    edges : (n_pieces + 1,) rising ln(rate); the curve and exp(ln(rate) + ln(stress)) bend little in a piece
    low, high : exponents of the power laws the curve follows below the first and above the last edge
    """

    def __init__(self, log_stress: Callable[[Array], Array], edges: Array, low: float, high: float):
        half, middle = 0.5 * np.diff(edges), 0.5 * (edges[1:] + edges[:-1])
        log_rate = middle + half * _NODES[:, None]
        log_product = log_rate + log_stress(log_rate)
        growth = np.exp(log_product - log_product[0])
        gained = half * (_INTEGRAL @ growth)
        start = np.empty_like(half)
        share = 1.0 / (1.0 + low)
        for piece, (gain, grown) in enumerate(zip(gained[-1], growth[-1], strict=True)):
            start[piece] = share
            share = (share + gain) / grown
        coefficients = np.linalg.solve(_POWERS, (start + gained) / growth)
        coefficients /= half ** np.arange(_DEGREE, -1, -1)[:, None]
        self._inside = Piecewise(edges[1:-1], middle, coefficients)
        self._first, self._last = edges[0], edges[-1]
        self._end_share, self._high = share, high

    def __call__(self, log_rate: Array) -> Array:
        share = self._inside(np.clip(log_rate, self._first, self._last))
        if np.any(log_rate > self._last):
            return np.where(log_rate > self._last, self._beyond(log_rate), share)
        return share

    def _beyond(self, log_rate: Array) -> Array:
        """Above the last edge: what was there fades, the power law's own share takes over."""
        distance, decay = np.maximum(log_rate - self._last, 0.0), 1.0 + self._high
        grown = -np.expm1(-decay * distance) / decay if decay else distance
        return self._end_share * np.exp(-decay * distance) + grown
