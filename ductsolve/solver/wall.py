"""Wall shear stress: the traction of the balanced stress, so that its sum is gradient x area."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ductsolve.mesh.loops import outline_loops
from ductsolve.mesh.sections import Section
from ductsolve.mesh.triangles import cross
from ductsolve.solver.fields import Level
from ductsolve.solver.whole import Whole

# A corner that opens into the fluid by more than this is re-entrant; less is a curved wall in chords.
REENTRANT_TURN = np.radians(15)
# How far from a re-entrant corner a largest stress is quoted, in hydraulic diameters.
CORNER_DISTANCE = 0.05


@dataclass(frozen=True, eq=False)
class WallShear:
    """Mean shear stress on each wall edge of the mesh, in order along each outline loop, fluid on the left.

    Attributes
    ----------
    edge : (n,) row of the edge among those of the whole section's mesh
    position : (n, 2) middle of each edge [m]
    stress : (n,) mean shear stress of the fluid on it [Pa]; sum(stress * length) = gradient x area
    length : (n,) its length [m]
    loop : (n,) outline loop it lies on, 0 the outer one
    wall : (n,) index into ``names``
    names : names of the walls
    corners : (k, 2) re-entrant corners, where the true stress is unbounded [m]
    near_corner : (n,) mask of pieces close to one
    """

    edge: np.ndarray
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
    loops = [loop[~mesh.symmetry_edges[loop]] for loop in outline_loops(mesh)]
    order = np.concatenate(loops)
    row = np.cumsum(~mesh.symmetry_edges)[order] - 1  # among the wall edges alone
    length = np.tile(forces.lengths.sum(axis=1), len(section.copies))[row]
    force = np.tile(forces(psi).sum(axis=1), len(section.copies))[row]
    position = mesh.points[mesh.edges[order, 2]]
    corners = np.vstack([_reentrant(mesh, loop) for loop in loops])
    away = CORNER_DISTANCE * section.hydraulic_diameter
    return WallShear(
        edge=order,
        position=position,
        stress=gradient * force / length,
        length=length,
        loop=np.repeat(np.arange(len(loops)), [len(loop) for loop in loops]),
        wall=mesh.edge_boundary[order],
        names=tuple(boundary.name for boundary in mesh.boundaries),
        corners=corners,
        near_corner=_distance(position, corners) < away,
    )


def _reentrant(mesh, loop):
    """Corners (k, 2) where consecutive wall edges of an ordered loop turn away from the fluid."""
    start, end, middle = mesh.points[mesh.edges[loop]].transpose(1, 0, 2)
    leaving = 3 * end - 4 * middle + start
    arriving = np.roll(4 * middle - 3 * start - end, -1, axis=0)
    turn = np.arctan2(cross(leaving, arriving), np.sum(leaving * arriving, axis=1))
    joined = mesh.edges[loop, 1] == np.roll(mesh.edges[loop, 0], -1)
    return end[joined & (turn < -REENTRANT_TURN)]


def _distance(points, corners):
    """Distance (n,) from each point to the nearest corner."""
    if not len(corners):
        return np.full(len(points), np.inf)
    return np.linalg.norm(points[:, None] - corners, axis=2).min(axis=1)
