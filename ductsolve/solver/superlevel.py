"""Parts of a section where a nodal field is positive: outline length over area, made least."""

from __future__ import annotations

import numpy as np
from scipy.optimize import minimize

from ductsolve.mesh.triangles import cross
from ductsolve.solver.fields import Level
from ductsolve.solver.walls import WallEdges

# The four straight triangles between a six-node triangle's nodes; the first three hold a corner each.
_QUARTERS = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2], [3, 4, 5]])
MOST_ITERATIONS = 100
TINY = 1e-300


class PositiveParts:
    """Sets {field >= 0} of nodal fields (n_points,), taken linear between neighbouring nodes.

    Symmetry lines do not count as outline. Behind a curved half-edge lies a sliver more (or less) than the
    straight triangle: it is counted in full where the triangle is, and against the set where it is cut.
    """

    def __init__(self, level: Level):
        mesh, walls = level.mesh, WallEdges(level.mesh)
        self._count = len(mesh.points)
        self._nodes = mesh.triangles[:, _QUARTERS].reshape(-1, 3)
        self._points = mesh.points[self._nodes]
        u, v = (self._points[:, k] - self._points[:, 0] for k in (1, 2))
        self._areas = np.abs(cross(u, v)) / 2
        self._slivers = _slivers(mesh, walls)
        edges = mesh.triangles[walls.owner[:, None], walls.nodes]
        self._wall = np.vstack([edges[:, [0, 2]], edges[:, [1, 2]]])
        self._wall_length = level.wall_forces.lengths.T.ravel()

    def ratio(self, field: np.ndarray) -> tuple[float, np.ndarray]:
        """Outline length over area [1/m] and its slope by each nodal value (n_points,)."""
        slopes = np.zeros((2, self._count))  # of length and of area
        positive = field[self._nodes] >= 0
        corners = positive.sum(axis=1)
        whole = corners == 3
        cut = (corners == 1) | (corners == 2)
        area = (self._areas[whole] + self._slivers[whole]).sum() + np.minimum(self._slivers[cut], 0.0).sum()
        length = self._wall_part(field, slopes)
        for kept in (1, 2):
            chosen = np.flatnonzero(corners == kept)
            if len(chosen):
                alone = positive[chosen] if kept == 1 else ~positive[chosen]
                part_length, part_area = self._cut_part(
                    field, chosen, alone.argmax(axis=1), kept == 1, slopes
                )
                length, area = length + part_length, area + part_area
        if area <= 0:
            return np.inf, np.zeros(self._count)
        return length / area, slopes[0] / area - length / area**2 * slopes[1]

    def _cut_part(self, field, chosen, corner, tip, slopes):
        """Length of the cuts through some triangles and the area kept; ``tip`` where only the corner is."""
        row = np.arange(len(chosen))
        nodes, points = self._nodes[chosen], self._points[chosen]
        here, at = nodes[row, corner], field[nodes[row, corner]]
        others = [nodes[row, (corner + k) % 3] for k in (1, 2)]
        reach = [points[row, (corner + k) % 3] - points[row, corner] for k in (1, 2)]
        share = [at / (at - field[other]) for other in others]
        across = share[0][:, None] * reach[0] - share[1][:, None] * reach[1]
        length = np.linalg.norm(across, axis=1)
        corner_area = self._areas[chosen] * share[0] * share[1]
        sign = 1.0 if tip else -1.0
        for k, other in enumerate(others):
            by_share = np.stack(
                [
                    (1 - 2 * k) * np.sum(across * reach[k], axis=1) / np.maximum(length, TINY),
                    sign * self._areas[chosen] * share[1 - k],
                ]
            )
            spread = (at - field[other]) ** 2
            for slope, value in zip(slopes, by_share, strict=True):
                slope += np.bincount(here, -value * field[other] / spread, self._count)
                slope += np.bincount(other, value * at / spread, self._count)
        return length.sum(), (corner_area if tip else self._areas[chosen] - corner_area).sum()

    def _wall_part(self, field, slopes):
        """Length of wall along the set."""
        order = np.argsort(field[self._wall], axis=1)
        lower, upper = np.take_along_axis(self._wall, order, axis=1).T
        low, high = field[lower], field[upper]
        crossed = np.flatnonzero((low < 0) & (high >= 0))
        long = self._wall_length[crossed]
        low_part, high_part = low[crossed], high[crossed]
        spread = (high_part - low_part) ** 2
        slopes[0] += np.bincount(upper[crossed], -long * low_part / spread, self._count)
        slopes[0] += np.bincount(lower[crossed], long * high_part / spread, self._count)
        return self._wall_length[low >= 0].sum() + (long * high_part / (high_part - low_part)).sum()


def least_ratio(parts: PositiveParts, fields: list[np.ndarray], thresholds: int) -> float:
    """Least outline length over area [1/m] found from nodal fields.

    Takes the best superlevel set of all fields, then moves its free outline by descent on the nodal values.
    Every set met is an upper bound; the least counts.
    """
    best, start = np.inf, None
    for values in fields:
        for threshold in np.quantile(values, np.linspace(0.0, 0.98, thresholds)):
            ratio = parts.ratio(values - threshold)[0]
            if ratio < best:
                best, start = ratio, values - threshold
    start = start / np.abs(start).max()
    found = minimize(parts.ratio, start, jac=True, method="L-BFGS-B", options={"maxiter": MOST_ITERATIONS})
    return min(best, float(found.fun)) if np.isfinite(found.fun) else best


def _slivers(mesh, walls):
    """Signed area between half-edge and chord, for each quarter triangle.

    Between a parabola and its chord lie 2/3 of the parallelogram of chord and sagitta, and between each half
    and the half's chord one eighth of that.
    """
    slivers = np.zeros((len(mesh.triangles), 4))
    start, end, middle = walls.points.transpose(1, 0, 2)
    behind = cross(middle - (start + end) / 2, end - start) * 2 / 3 / 8
    for k in (0, 1):
        np.add.at(slivers, (walls.owner, walls.nodes[:, k]), behind)
    return slivers.ravel()
