"""Points on the wall edges: traction of a stress function there, and values of a velocity."""

from __future__ import annotations

import numpy as np

from ductsolve.solver.fields import Level

# Simpson's rule: start, end and middle of each edge, in the order of its nodes.
_AT = np.array([0.0, 1.0, 0.5])
_WEIGHTS = np.array([1.0, 1.0, 4.0]) / 6
_SLOPES = np.stack([4 * _AT - 3, 4 * _AT - 1, 4 - 8 * _AT])


class WallPoints:
    """Start, end and middle of every wall edge.

    Attributes
    ----------
    weights : (n, 3) lengths the points stand for [m]
    owner : (n,) triangle of each edge
    nodes : (n, 3) its local numbers of the edge's nodes
    """

    def __init__(self, level: Level):
        mesh = level.mesh
        edges = np.flatnonzero(~mesh.symmetry_edges)
        self.owner = mesh.edge_owner[edges]
        self.nodes = np.argmax(
            mesh.triangles[self.owner][:, None, :] == mesh.edges[edges][:, :, None], axis=2
        )
        points = mesh.points[mesh.edges[edges]]
        along = np.einsum("kq,nkd->nqd", _SLOPES, points)
        speed = np.linalg.norm(along, axis=2)
        self.weights = speed * _WEIGHTS
        # Derivative by arc length at each point, from the three nodal values: (n, nodes, points).
        self._slope = _SLOPES / speed[:, None, :]
        arm = points - level.origin
        self._known = (arm[..., 0] * along[..., 1] - arm[..., 1] * along[..., 0]) / (2 * speed)

    def traction(self, psi: np.ndarray) -> np.ndarray:
        """Pull of the fluid on the wall (n, 3) per unit gradient [m]."""
        return self._known + self.traction_change(psi)

    def traction_change(self, psi: np.ndarray) -> np.ndarray:
        """Part of it (n, 3) that the stress function brings [m]."""
        return -np.einsum("nk,nkq->nq", self.values(psi), self._slope)

    def values(self, local: np.ndarray) -> np.ndarray:
        """Values (n, 3) of local nodal values (n_triangles, 6) at the points, which are nodes."""
        return local[self.owner[:, None], self.nodes]

    def add_traction_load(self, load: np.ndarray, field: np.ndarray):
        """Add int field x (traction change of each shape function) to local loads (n_triangles, 6)."""
        part = -np.einsum("nq,nkq->nk", self.weights * field, self._slope)
        np.add.at(load, (self.owner[:, None], self.nodes), part)

    def add_traction_stiffness(self, stiffness: np.ndarray, coefficient: np.ndarray):
        """Add int coefficient x products of traction changes to local matrices (n_triangles, 36)."""
        part = np.einsum("nq,niq,njq->nij", self.weights * coefficient, self._slope, self._slope)
        index = 6 * self.nodes[:, :, None] + self.nodes[:, None, :]
        np.add.at(stiffness, (self.owner[:, None, None], index), part)

    def add_value_load(self, load: np.ndarray, field: np.ndarray):
        """Add int field x (each shape function) to local loads (n_triangles, 6)."""
        np.add.at(load, (self.owner[:, None], self.nodes), self.weights * field)

    def add_value_stiffness(self, stiffness: np.ndarray, coefficient: np.ndarray):
        """Add int coefficient x products of shape functions to local matrices (n_triangles, 36)."""
        np.add.at(stiffness, (self.owner[:, None], 7 * self.nodes), self.weights * coefficient)
