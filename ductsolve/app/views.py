"""How a section is laid on paper: to scale, stretched if it is slender, unrolled if it is a thin ring."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ductsolve.app.case import ReportUnit
from ductsolve.solver.flow import DuctFlow

SLENDER = 8.0  # longer than so many times its width, a section is stretched
THIN_RING = 0.06  # gap over outer diameter, below which a ring is unrolled
WINDOW = 4.0  # length of the true-scale window on the end of a slender section, in its widths


@dataclass(frozen=True, eq=False)
class View:
    """Paper coordinates of a section, in the unit of its lengths.

    Attributes
    ----------
    unit : of lengths
    points : (n, 2) of the section's mesh [m]
    ring : outer radius of a ring to be unrolled [m], 0 for none
    """

    unit: ReportUnit
    points: np.ndarray
    ring: float = 0.0

    @cached_property
    def extents(self) -> np.ndarray:
        """Lower and upper paper coordinates (2, 2)."""
        if not self.ring:
            return np.stack([self.points.min(axis=0), self.points.max(axis=0)]) * self.unit.per_si
        half, depth = np.pi * self.ring, self.ring - np.linalg.norm(self.points, axis=1)
        return np.array([[-half, 0.0], [half, depth.max()]]) * self.unit.per_si

    @property
    def stretched(self) -> bool:
        """Whether the two directions have different scales."""
        size = np.ptp(self.extents, axis=0)
        return bool(max(size) > SLENDER * min(size))

    @property
    def long(self) -> int:
        """The longer direction, 0 or 1."""
        return int(np.argmax(np.ptp(self.extents, axis=0)))

    @property
    def labels(self) -> tuple[str, str]:
        """Labels of the axes."""
        if self.ring:
            return (
                f"distance round the outer wall from its lowest point [{self.unit.unit}]",
                f"from the outer wall [{self.unit.unit}]",
            )
        return f"x [{self.unit.unit}]", f"y [{self.unit.unit}]"

    @property
    def end(self) -> np.ndarray | None:
        """Window (2, 2) on the far end of a slender section, None where there is no need of one."""
        if not self.stretched or self.ring:
            return None
        low, high = self.extents.copy()
        low[self.long] = high[self.long] - WINDOW * np.ptp(self.extents, axis=0).min()
        return np.stack([low, high])

    def lines(self, lines: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Lines (n, k, 2) [m] on paper, and which of those given each of them is.

        Where a ring is cut open, what crosses the cut appears on both sides.
        """
        if not self.ring:
            return lines * self.unit.per_si, np.arange(len(lines))
        return self._unrolled(lines)

    def triangles(self, points: np.ndarray, triangles: np.ndarray):
        """Points on paper, triangles between them, and which of ``points`` each of them is."""
        everyone = np.arange(len(points))
        if not self.ring:
            return points * self.unit.per_si, triangles, everyone
        flat = self._unrolled(points[:, None])[0][:, 0]
        cut = np.ptp(flat[triangles, 0], axis=1) > np.ptp(self.extents[:, 0]) / 2
        corners, source = self._unrolled(points[triangles[cut]])
        extra = len(points) + np.arange(3 * len(corners)).reshape(-1, 3)
        return (
            np.vstack([flat, corners.reshape(-1, 2)]),
            np.vstack([triangles[~cut], extra]),
            np.append(everyone, triangles[cut][source].ravel()),
        )

    def _unrolled(self, shapes):
        """Shapes (m, k, 2) of a ring laid flat, and which of those given (n, k, 2) each of them is."""
        radius = np.linalg.norm(shapes, axis=-1)
        angle = np.arctan2(shapes[..., 0], -shapes[..., 1])
        middle = np.arctan2(shapes[..., 0].mean(axis=1), -shapes[..., 1].mean(axis=1))[:, None]
        angle = middle + (angle - middle + np.pi) % (2 * np.pi) - np.pi
        flat = np.stack([self.ring * angle, self.ring - radius], axis=-1) * self.unit.per_si
        turn = np.array([2 * np.pi * self.ring * self.unit.per_si, 0.0])
        right, left = (angle > np.pi * (1 + 1e-9)).any(axis=1), (angle < -np.pi * (1 + 1e-9)).any(axis=1)
        all_of = np.arange(len(shapes))
        return (
            np.concatenate([flat, flat[right] - turn, flat[left] + turn]),
            np.concatenate([all_of, all_of[right], all_of[left]]),
        )


def view_of(flow: DuctFlow, unit: ReportUnit) -> View:
    """The view that suits a flow's section."""
    lengths = flow.section.dimensions
    outer, inner = lengths.get("outer_diameter", 0.0), lengths.get("inner_diameter", 0.0)
    thin = outer and (outer - inner) / 2 < THIN_RING * outer
    return View(unit, flow.mesh.points, outer / 2 if thin else 0.0)
