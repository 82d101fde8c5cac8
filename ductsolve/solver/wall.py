"""Wall shear stress: the traction of the balanced stress, so that its sum is gradient x area."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ductsolve.mesh.loops import outline_loops
from ductsolve.mesh.sections import Section
from ductsolve.solver.fields import Level
from ductsolve.solver.whole import Whole

# A corner that opens into the fluid by more than this is re-entrant; less is a curved wall in chords.
REENTRANT_TURN = np.radians(15)
# How far from a re-entrant corner a largest stress is quoted, in hydraulic diameters.
CORNER_DISTANCE = 0.05


@dataclass(frozen=True, eq=False)
class WallShear:
    """Mean shear stress on short pieces of wall, in order along each outline loop, fluid on the left.

    Attributes
    ----------
    position : (n, 2) middle of each piece [m]
    stress : (n,) mean shear stress of the fluid on it [Pa]; sum(stress * length) = gradient x area
    length : (n,) its length [m]
    loop : (n,) outline loop it lies on, 0 the outer one
    wall : (n,) index into ``names``
    names : names of the walls
    corners : (k, 2) re-entrant corners, where the true stress is unbounded [m]
    near_corner : (n,) mask of pieces close to one
    """

    position: np.ndarray
    stress: np.ndarray
    length: np.ndarray
    loop: np.ndarray
    wall: np.ndarray
    names: tuple[str, ...]
    corners: np.ndarray
    near_corner: np.ndarray

    @cached_property
    def mean(self) -> float:
        """Mean over the wetted perimeter, gradient x hydraulic diameter / 4 [Pa]."""
        return float(np.sum(self.stress * self.length) / np.sum(self.length))

    @cached_property
    def max(self) -> float:
        """Largest stress [Pa]; infinite where a re-entrant corner makes it unbounded."""
        return np.inf if len(self.corners) and self.stress.any() else float(self.stress.max())

    @cached_property
    def largest_away(self) -> tuple[float, np.ndarray]:
        """Largest stress away from re-entrant corners [Pa] and its position (2,) [m]."""
        at = int(np.argmax(np.where(self.near_corner, -np.inf, self.stress)))
        return float(self.stress[at]), self.position[at]

    @cached_property
    def smallest(self) -> tuple[float, np.ndarray]:
        """Smallest stress [Pa] and its position (2,) [m]."""
        at = int(np.argmin(self.stress))
        return float(self.stress[at]), self.position[at]

    @property
    def min(self) -> float:
        """Smallest stress [Pa]."""
        return self.smallest[0]


def wall_shear(section: Section, level: Level, whole: Whole, psi: np.ndarray, gradient: float) -> WallShear:
    """Wall shear of the whole section from the stress function on the part that is solved."""
    mesh, forces = whole.mesh, level.wall_forces
    force = _copied(forces(psi), whole.mirrored)
    length = _copied(forces.lengths, whole.mirrored)
    loops = outline_loops(mesh)
    order = np.concatenate(loops)
    halves = mesh.points[mesh.edges[order]]
    start, end, middle = halves[:, 0], halves[:, 1], halves[:, 2]
    position = np.stack(
        [0.375 * start + 0.75 * middle - 0.125 * end, 0.375 * end + 0.75 * middle - 0.125 * start]
    )
    position = position.transpose(1, 0, 2).reshape(-1, 2)
    corners = np.vstack([_reentrant(mesh.points[mesh.edges[loop]]) for loop in loops])
    away = CORNER_DISTANCE * section.hydraulic_diameter
    return WallShear(
        position=position,
        stress=gradient * (force[order] / length[order]).ravel(),
        length=length[order].ravel(),
        loop=np.repeat(np.arange(len(loops)), [2 * len(loop) for loop in loops]),
        wall=np.repeat(mesh.edge_boundary[order], 2),
        names=tuple(boundary.name for boundary in mesh.boundaries),
        corners=corners,
        near_corner=_distance(position, corners) < away,
    )


def _copied(halves, mirrored):
    """Values (n, 2) on the halves of the part's wall edges, for all copies."""
    return np.vstack([halves[:, ::-1] if m else halves for m in mirrored])


def _reentrant(edges):
    """Corners (k, 2) where an ordered loop of parabolic edges (n, 3, 2) turns away from the fluid."""
    start, end, middle = edges[:, 0], edges[:, 1], edges[:, 2]
    leaving = 3 * end - 4 * middle + start
    arriving = np.roll(4 * middle - 3 * start - end, -1, axis=0)
    cross = leaving[:, 0] * arriving[:, 1] - leaving[:, 1] * arriving[:, 0]
    turn = np.arctan2(cross, np.sum(leaving * arriving, axis=1))
    return end[turn < -REENTRANT_TURN]


def _distance(points, corners):
    """Distance (n,) from each point to the nearest corner."""
    if not len(corners):
        return np.full(len(points), np.inf)
    return np.linalg.norm(points[:, None] - corners, axis=2).min(axis=1)
