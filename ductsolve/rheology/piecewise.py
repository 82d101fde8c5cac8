"""Piecewise polynomials of one variable, evaluated on arrays of any shape."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.rheology.fluid import Array


@dataclass(frozen=True, eq=False)
class Piecewise:
    """Polynomials in the distance from each piece's origin.

    breaks : (n_pieces - 1,) rising; origin : (n_pieces,); coefficients : (degree + 1, n_pieces),
    highest power first.
    """

    breaks: Array
    origin: Array
    coefficients: Array

    def locate(self, x: Array) -> tuple[Array, Array]:
        """Piece each x lies in and its distance from that piece's origin."""
        piece = np.searchsorted(self.breaks, x)
        return piece, x - self.origin[piece]

    def at(self, piece: Array, distance: Array) -> Array:
        value = self.coefficients[0][piece]
        for row in self.coefficients[1:]:
            value = value * distance
            value += row[piece]
        return value

    def __call__(self, x: Array) -> Array:
        return self.at(*self.locate(x))

    def derivative(self) -> Piecewise:
        degree = len(self.coefficients) - 1
        powers = np.arange(degree, 0, -1)[:, None]
        return Piecewise(self.breaks, self.origin, powers * self.coefficients[:-1])


def hermite(knots: Array, values: Array, slopes: Array) -> Piecewise:
    """Cubic through values and slopes at rising knots, straight beyond both ends."""
    width, zero = np.diff(knots), np.zeros(1)
    secant = np.diff(values) / width
    square = (3.0 * secant - 2.0 * slopes[:-1] - slopes[1:]) / width
    cube = (slopes[:-1] + slopes[1:] - 2.0 * secant) / width**2
    origin = np.concatenate((knots[:1], knots))
    rows = (
        np.concatenate((zero, cube, zero)),
        np.concatenate((zero, square, zero)),
        np.concatenate((slopes[:1], slopes)),
        np.concatenate((values[:1], values)),
    )
    return Piecewise(knots, origin, np.array(rows))
