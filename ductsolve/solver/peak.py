"""Largest value of a quadratic field."""

from __future__ import annotations

import numpy as np


def largest_value(local: np.ndarray) -> float:
    """Largest value of a field of local values (n_triangles, 6): at a node, or where the quadratic between
    nodes peaks; never below 0."""
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
