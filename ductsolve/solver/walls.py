"""Wall edges: forces of a stress function on their halves, tractions and velocities at their nodes."""

from __future__ import annotations

import numpy as np

from ductsolve.mesh.triangles import Mesh, edge_shapes


class WallEdges:
    """The wall edges of a mesh and where their nodes are in the triangles they belong to.

    Attributes
    ----------
    rows : (n,) rows of the wall edges among the mesh's outline edges
    owner : (n,) triangle of each
    nodes : (n, 3) its local numbers of the edge's start, end and middle
    points : (n, 3, 2) coordinates of these nodes [m]
    """

    def __init__(self, mesh: Mesh):
        self.rows = np.flatnonzero(~mesh.symmetry_edges)
        self.owner = mesh.edge_owner[self.rows]
        edges = mesh.edges[self.rows]
        self.nodes = np.argmax(mesh.triangles[self.owner][:, None, :] == edges[:, :, None], axis=2)
        self.points = mesh.points[edges]

    def values(self, local: np.ndarray) -> np.ndarray:
        """Values (n, 3) of local nodal values (n_triangles, 6) at start, end and middle."""
        return local[self.owner[:, None], self.nodes]


# On the first half of a parabola, s from 0 to 1/2: Gauss weights, shape functions of start, end and middle
# and their derivatives.
_X, _W = np.polynomial.legendre.leggauss(4)
_S, _HALF_WEIGHTS = (_X + 1) / 4, _W / 4
_HALF_SHAPES = edge_shapes(_S)
_HALF_SLOPES = np.stack([4 * _S - 3, 4 * _S - 1, 4 - 8 * _S])
_REVERSED = [1, 0, 2]


class WallForces(WallEdges):
    """Pull of the fluid on the halves of every wall edge, per unit length of duct and unit gradient.

    Attributes
    ----------
    lengths : (n, 2) lengths of the halves from start to middle and from middle to end [m]
    """

    def __init__(self, mesh: Mesh, origin: np.ndarray):
        super().__init__(mesh)
        backward = self.points[:, _REVERSED]
        self.lengths = np.stack([_half_length(self.points), _half_length(backward)], axis=1)
        # The known part of the stress pulls on each half by the integral of (x - origin) . n / 2.
        arms = self.points - origin
        self._known = np.stack([_half_moment(arms), -_half_moment(arms[:, _REVERSED])], axis=1)

    def __call__(self, psi: np.ndarray) -> np.ndarray:
        """Forces (n, 2) [m2] on the halves for a stress function (n_triangles, 6)."""
        start, end, middle = self.values(psi).T
        return self._known - np.column_stack([middle - start, end - middle])


def _half_length(nodes):
    """Length (n,) of the first half of parabolas (n, 3, 2)."""
    dx, dy = (nodes[..., i] @ _HALF_SLOPES for i in (0, 1))
    return np.sqrt(dx**2 + dy**2) @ _HALF_WEIGHTS


def _half_moment(arms):
    """Half the integral of x dy - y dx over the first half of parabolas (n, 3, 2)."""
    x, y = arms[..., 0], arms[..., 1]
    turning = (x @ _HALF_SHAPES) * (y @ _HALF_SLOPES) - (y @ _HALF_SHAPES) * (x @ _HALF_SLOPES)
    return turning @ _HALF_WEIGHTS / 2


# Simpson's rule on a parabola's start, end and middle, and derivatives of the three shape functions there.
_AT = np.array([0.0, 1.0, 0.5])
_SIMPSON = np.array([1.0, 1.0, 4.0]) / 6
_SLOPES = np.stack([4 * _AT - 3, 4 * _AT - 1, 4 - 8 * _AT])


class WallPoints(WallEdges):
    """Tractions and slip at the nodes of every wall edge.

    Attributes
    ----------
    weights : (n, 3) lengths the nodes stand for [m]
    """

    def __init__(self, mesh: Mesh, origin: np.ndarray):
        super().__init__(mesh)
        along = np.einsum("kq,nkd->nqd", _SLOPES, self.points)
        speed = np.linalg.norm(along, axis=2)
        self.weights = speed * _SIMPSON
        # Derivative by arc length at each node, from the three nodal values: (n, nodes, points).
        self._slope = _SLOPES / speed[:, None, :]
        arm = self.points - origin
        self._known = (arm[..., 0] * along[..., 1] - arm[..., 1] * along[..., 0]) / (2 * speed)

    def traction(self, psi: np.ndarray) -> np.ndarray:
        """Pull of the fluid on the wall (n, 3) per unit gradient [m]."""
        return self._known + self.traction_change(psi)

    def traction_change(self, psi: np.ndarray) -> np.ndarray:
        """Part of it (n, 3) that the stress function brings [m]."""
        return -np.einsum("nk,nkq->nq", self.values(psi), self._slope)

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
