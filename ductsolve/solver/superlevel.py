"""Parts of a section above a value of a nodal field: their area and outline length."""

from __future__ import annotations

import numpy as np

from ductsolve.solver.fields import Level
from ductsolve.solver.quadratic import Elements, interior
from ductsolve.solver.wallpoints import WallPoints

# The four straight triangles between a six-node triangle's nodes; the first three hold a corner each.
_QUARTERS = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2], [3, 4, 5]])


class Superlevels:
    """Sets {field >= value}, the field taken linear between neighbouring nodes.

    Symmetry lines do not count as outline. Behind a curved half-edge lies a sliver more (or less) than the
    straight triangle: it is counted in full where the triangle is, and against the set where it is cut.
    """

    def __init__(self, level: Level, field: np.ndarray):
        values = field[:, _QUARTERS].reshape(-1, 3)
        points = Elements(level.mesh, interior()).nodes[:, _QUARTERS].reshape(-1, 3, 2)
        order = np.argsort(values, axis=1)
        self._values = np.take_along_axis(values, order, axis=1)
        self._points = np.take_along_axis(points, order[..., None], axis=1)
        self._areas = _areas(points)
        walls = WallPoints(level)
        self._slivers = _slivers(level, walls)
        start, end, middle = walls.values(field).T
        self._wall = np.sort(np.vstack([np.column_stack([start, middle]), np.column_stack([end, middle])]))
        self._wall_length = level.wall_forces.lengths.T.ravel()

    def ratio(self, value: float) -> float:
        """Outline length over area [1/m] of the part of the field at or above ``value``."""
        low, mid, high = self._values.T
        whole = low >= value
        lost = (low < value) & (value <= mid)  # the lowest corner is cut off
        left = (mid < value) & (value < high)  # only the highest corner remains
        cut, rest = _corner(self._values[lost], self._points[lost], 0, value)
        tip, kept = _corner(self._values[left], self._points[left], 2, value)
        area = self._areas[whole].sum() + self._slivers[whole].sum()
        area += (self._areas[lost] * (1 - rest)).sum() + (self._areas[left] * kept).sum()
        area += np.minimum(self._slivers[lost | left], 0.0).sum()
        lower, upper = self._wall.T
        span = np.where(upper > lower, upper - lower, 1.0)
        share = np.where(lower >= value, 1.0, np.clip((upper - value) / span, 0.0, 1.0))
        length = cut.sum() + tip.sum() + share @ self._wall_length
        return float(length / area) if area > 0 else np.inf


def _corner(values, points, corner, value):
    """Length of the cut at ``value`` across triangles and the share of area on one corner's side of it."""
    others = [k for k in range(3) if k != corner]
    at = [(value - values[:, corner]) / (values[:, k] - values[:, corner]) for k in others]
    first, second = (
        points[:, corner] + t[:, None] * (points[:, k] - points[:, corner])
        for t, k in zip(at, others, strict=True)
    )
    return np.linalg.norm(second - first, axis=1), at[0] * at[1]


def _areas(points):
    return np.abs(_cross(points[:, 1] - points[:, 0], points[:, 2] - points[:, 0])) / 2


def _cross(u, v):
    return u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]


def _slivers(level, walls):
    """Signed area between half-edge and chord, for each quarter triangle.

    Between a parabola and its chord lie 2/3 of the parallelogram of chord and sagitta, and between each half
    and the half's chord one eighth of that.
    """
    slivers = np.zeros((len(level.mesh.triangles), 4))
    nodes = level.mesh.points[level.mesh.triangles][walls.owner[:, None], walls.nodes]
    start, end, middle = nodes[:, 0], nodes[:, 1], nodes[:, 2]
    behind = _cross(middle - (start + end) / 2, end - start) * 2 / 3 / 8
    for k in (0, 1):
        np.add.at(slivers, (walls.owner, walls.nodes[:, k]), behind)
    return slivers.ravel()
