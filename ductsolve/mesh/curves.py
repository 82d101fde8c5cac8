"""True curves behind wall edges, so that refinement follows the wall and not the first mesh."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True, eq=False)
class EllipseArc:
    """An ellipse with axes along x and y, of which a wall follows some part.

    Attributes
    ----------
    centre : (2,) [m]
    half_axes : (2,) half the width and half the height [m]
    """

    centre: tuple[float, float]
    half_axes: tuple[float, float]

    def project(self, points: np.ndarray) -> np.ndarray:
        """Move points (n, 2) onto the curve along rays from its centre."""
        unit = self._unit(points)
        return self._true(unit / np.linalg.norm(unit, axis=1, keepdims=True))

    def mid_nodes(self, start: np.ndarray, end: np.ndarray) -> np.ndarray:
        """Mid-edge nodes (n, 2) whose parabola from start to end encloses the arc's exact area.

        The area between a chord and a parabola through its ends is 2/3 chord x sagitta; equating it
        with the circular segment's (a - sin a)/2, with a the angle of the arc on the unit circle, fixes
        the sagitta. Areas of meshes are then exact, and the error of position is of fourth order with
        zero mean. An ellipse is an affine image of the circle, which keeps ratios of areas.
        """
        p, q = self._unit(start), self._unit(end)
        angle = 2 * np.arcsin(np.minimum(np.linalg.norm(q - p, axis=1) / 2, 1))
        sagitta = 3 * _segment_area(angle) / (2 * 2 * np.sin(angle / 2))
        middle = (p + q) / 2
        outward = middle / np.linalg.norm(middle, axis=1, keepdims=True)
        return self._true(middle + sagitta[:, None] * outward)

    def distance(self, points: np.ndarray) -> np.ndarray:
        """Upper bound (n,) on the distance of points near the curve from it [m]."""
        return np.linalg.norm(points - self.project(points), axis=1)

    def _unit(self, points):
        return (points - np.asarray(self.centre)) / np.asarray(self.half_axes)

    def _true(self, unit):
        return unit * np.asarray(self.half_axes) + np.asarray(self.centre)


def _segment_area(angle):
    """(angle - sin angle)/2, by its series where the difference would lose digits."""
    series = angle**3 / 12 * (1 - angle**2 / 20 * (1 - angle**2 / 42 * (1 - angle**2 / 72)))
    return np.where(angle < 0.3, series, (angle - np.sin(angle)) / 2)
