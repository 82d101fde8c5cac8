"""The two fields of one level: the balanced stress from its stress function, and the velocity."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.triangles import Mesh
from ductsolve.solver.quadratic import Elements, interior
from ductsolve.solver.system import System


@dataclass(frozen=True, eq=False)
class Level:
    """One mesh with everything that is computed once on it.

    Stresses are kept per unit pressure gradient, so that they outlive a change of the gradient:
    ``stress / G = -(x - origin)/2 + (d psi/dy, -d psi/dx)`` [m], with psi the stress function [m2].

    Attributes
    ----------
    mesh : six-node triangles
    origin : (2,) point through which all symmetry lines run
    cuts : (n_triangles, 6, n_holes) local values of a unit jump of the stress function around each hole,
        or None without holes
    """

    mesh: Mesh
    origin: np.ndarray
    cuts: np.ndarray | None = None

    @cached_property
    def elements(self) -> Elements:
        """Geometry at the points of assembly."""
        return Elements(self.mesh, interior())

    @cached_property
    def stress_system(self) -> System:
        """Unknowns of the stress function: free on walls, one constant on each symmetry line."""
        return System(self._stress_unknowns()[self.mesh.triangles], self.cuts)

    @cached_property
    def velocity_system(self) -> System:
        """Unknowns of the velocity: free except on walls."""
        free = np.ones(len(self.mesh.points), dtype=bool)
        free[self.mesh.wall_edges] = False
        return System(np.where(free, np.cumsum(free) - 1, -1)[self.mesh.triangles])

    def _stress_unknowns(self):
        """Number of the unknown behind each node; the first symmetry line (or node) is the zero."""
        count = len(self.mesh.points)
        on_line = self.mesh.edges[self.mesh.symmetry_edges]
        if not len(on_line):
            return np.arange(count) - 1
        links = coo_array(
            (np.ones(2 * len(on_line)), (np.tile(on_line[:, 2], 2), on_line[:, :2].T.ravel())), (count, count)
        )
        _, line = connected_components(links, directed=False)
        line = np.where(line == line[on_line[0, 0]], -1, line)
        used = np.unique(line[line >= 0])
        return np.where(line >= 0, np.searchsorted(used, line), -1)

    def stress(self, psi: np.ndarray, elements: Elements | None = None) -> np.ndarray:
        """Balanced stress per unit gradient (2, n_triangles, n) [m] of local values (n_triangles, 6)."""
        elements = elements or self.elements
        known = (self.origin[:, None, None] - elements.position) / 2
        return known + curl(elements.gradient(psi))

    def nodal(self, local: np.ndarray) -> np.ndarray:
        """Values (n_points,) of a continuous field from local values (n_triangles, 6)."""
        values = np.empty(len(self.mesh.points))
        values[self.mesh.triangles] = local
        return values

    @cached_property
    def wall_forces(self) -> WallForces:
        """What a stress function means as force on the walls."""
        return WallForces(self)

    def refined(self, marked: np.ndarray, psi: np.ndarray) -> tuple[Level, np.ndarray]:
        """Bisect the marked triangles; returns the new level and the stress function on it."""
        step = bisect(self.mesh, marked)
        cuts = None if self.cuts is None else step.local @ self.cuts[step.parent]
        new_psi = np.einsum("tij,tj->ti", step.local, psi[step.parent])
        return replace(self, mesh=step.mesh, cuts=cuts), new_psi


class WallForces:
    """Forces of the flow on the halves of every wall edge, per unit length of duct and unit gradient.

    Attributes
    ----------
    edges : (n,) the wall's rows among the mesh's outline edges
    lengths : (n, 2) lengths of the halves from start to middle and from middle to end [m]
    """

    def __init__(self, level: Level):
        mesh = level.mesh
        self.edges = np.flatnonzero(~mesh.symmetry_edges)
        self._owner = mesh.edge_owner[self.edges]
        nodes = mesh.edges[self.edges][:, [0, 2, 1]]
        self._local = np.argmax(mesh.triangles[self._owner][:, None, :] == nodes[:, :, None], axis=2)
        points = mesh.points[nodes]
        self.lengths = np.stack([_half_length(points), _half_length(points[:, ::-1])], axis=1)
        # The known part of the stress pushes on each half by (x - origin) . n / 2.
        x, y = np.moveaxis(points - level.origin, 2, 0)
        self._known = np.stack([_known_force(x, y), -_known_force(x[:, ::-1], y[:, ::-1])], axis=1)

    def __call__(self, psi: np.ndarray) -> np.ndarray:
        """Forces (n, 2) [m2] on the halves for a stress function (n_triangles, 6): pull of the fluid."""
        ends = np.take_along_axis(psi[self._owner], self._local, axis=1)
        return self._known - np.diff(ends, axis=1)


# On the first half of a parabola through (start, middle, end): derivatives and integrals in s from 0 to 1/2.
_HALF_S, _HALF_W = (np.polynomial.legendre.leggauss(4)[0] + 1) / 4, np.polynomial.legendre.leggauss(4)[1] / 4
_HALF_N = np.stack(
    [(1 - _HALF_S) * (1 - 2 * _HALF_S), 4 * _HALF_S * (1 - _HALF_S), _HALF_S * (2 * _HALF_S - 1)]
)
_HALF_D = np.stack([4 * _HALF_S - 3, 4 - 8 * _HALF_S, 4 * _HALF_S - 1])


def _half_length(points):
    """Length (n,) of the first half of parabolas (n, 3, 2)."""
    dx, dy = (points[..., i] @ _HALF_D for i in (0, 1))
    return np.sqrt(dx**2 + dy**2) @ _HALF_W


def _known_force(x, y):
    """Half the integral of x dy - y dx over the first half of parabolas with nodes (n, 3)."""
    return ((x @ _HALF_N) * (y @ _HALF_D) - (y @ _HALF_N) * (x @ _HALF_D)) @ _HALF_W / 2


def curl(gradient: np.ndarray) -> np.ndarray:
    """(d/dy, -d/dx) from a gradient (2, ...)."""
    return np.stack([gradient[1], -gradient[0]])
