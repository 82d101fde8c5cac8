"""The two fields of one level: the balanced stress from its stress function, and the velocity."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.triangles import Mesh
from ductsolve.solver.quadratic import Elements, Rule, interior
from ductsolve.solver.system import System
from ductsolve.solver.walls import WallForces


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

    def at(self, rule: Rule) -> Elements:
        """Geometry at the points of a rule, worked out once."""
        if rule not in self._at:
            self._at[rule] = Elements(self.mesh, rule)
        return self._at[rule]

    @cached_property
    def _at(self) -> dict[Rule, Elements]:
        return {}

    @property
    def elements(self) -> Elements:
        """Geometry at the points of assembly."""
        return self.at(interior())

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
        return WallForces(self.mesh, self.origin)

    def refined(self, marked: np.ndarray, psi: np.ndarray) -> tuple[Level, np.ndarray]:
        """Bisect the marked triangles; returns the new level and the stress function on it."""
        step = bisect(self.mesh, marked)
        cuts = None if self.cuts is None else step.local @ self.cuts[step.parent]
        new_psi = np.einsum("tij,tj->ti", step.local, psi[step.parent])
        return replace(self, mesh=step.mesh, cuts=cuts), new_psi


def size(vector: np.ndarray) -> np.ndarray:
    """Euclidean length of a vector field (2, ...)."""
    return np.sqrt(vector[0] ** 2 + vector[1] ** 2)


def curl(gradient: np.ndarray) -> np.ndarray:
    """(d/dy, -d/dx) from a gradient (2, ...)."""
    return np.stack([gradient[1], -gradient[0]])


def curl_transposed(vector: np.ndarray) -> np.ndarray:
    """Vector field v' (2, ...) with v . curl(f) = v' . grad(f) for any f."""
    return np.stack([-vector[1], vector[0]])
