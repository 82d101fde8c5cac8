"""What there is to draw: the section in fine straight triangles, its outline and its mesh lines."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.mesh.triangles import SAME_PLACE, SIDES, Mesh, edge_points
from ductsolve.solver.flow import DuctFlow
from ductsolve.solver.quadratic import corner_rule

MOST_TRIANGLES = 24_000  # more do not show in a picture of a page's width
SIDE_SAMPLES = np.linspace(0, 1, 9)


@dataclass(frozen=True, eq=False)
class Drawing:
    """The section in straight triangles, fine enough that curved walls and contours look smooth.

    Attributes
    ----------
    points : (n, 2) [m]
    triangles : (m, 3)
    weights, nodes : (n, 6) shape functions of the points and the nodes of the mesh they belong to
    """

    points: np.ndarray
    triangles: np.ndarray
    weights: np.ndarray
    nodes: np.ndarray

    def values(self, nodal: np.ndarray) -> np.ndarray:
        """Values (n,) at the points of a field given at the nodes of the mesh."""
        return np.einsum("nk,nk->n", self.weights, nodal[self.nodes])


def drawing(mesh: Mesh) -> Drawing:
    """Cut every six-node triangle of a mesh into equal parts."""
    count = len(mesh.triangles)
    level = next(k for k in (3, 2, 1) if k == 1 or count * 4**k <= MOST_TRIANGLES)
    rule, parts = corner_rule(level), _parts(2**level)
    local = len(rule.points)
    weights = np.tile(rule.values, (count, 1))
    nodes = np.repeat(mesh.triangles, local, axis=0)
    points = np.einsum("nk,nkd->nd", weights, mesh.points[nodes])
    grid = np.round(points / (SAME_PLACE * np.ptp(mesh.points, axis=0).max()))
    _, first, number = np.unique(grid, axis=0, return_index=True, return_inverse=True)
    triangles = (parts + local * np.arange(count)[:, None, None]).reshape(-1, 3)
    return Drawing(points[first], number.ravel()[triangles], weights[first], nodes[first])


def _parts(n):
    """Triangles (n^2, 3) between the points (i, j), i + j <= n, numbered as in ``corner_rule``."""
    number = {(i, j): k for k, (i, j) in enumerate((i, j) for i in range(n + 1) for j in range(n + 1 - i))}
    upright = [(number[i, j], number[i + 1, j], number[i, j + 1]) for i, j in number if i + j < n]
    inverted = [
        (number[i + 1, j], number[i + 1, j + 1], number[i, j + 1]) for i, j in number if i + j < n - 1
    ]
    return np.array(upright + inverted)


def smoothed(mesh: Mesh, nodal: np.ndarray) -> np.ndarray:
    """Values (n_points,) at the nodes of a mesh without the scatter from one triangle to the next.

    Around every corner a quadratic is fitted by least squares to the nodes of the triangles that meet
    there; the fits are averaged. A quadratic comes through unchanged. A mesh too fine for its triangles
    to show is left as it is.
    """
    if len(mesh.triangles) > MOST_TRIANGLES:
        return nodal
    corner, count = mesh.triangles[:, :3], len(mesh.points)
    offset = mesh.points[mesh.triangles][:, None] - mesh.points[corner][:, :, None]
    reach = np.zeros(count)
    np.maximum.at(reach, corner, np.abs(offset).max(axis=(2, 3)))
    x, y = np.moveaxis(offset / reach[corner][:, :, None, None], -1, 0)
    powers = np.stack([np.ones_like(x), x, y, x * x, x * y, y * y], axis=-1)
    matrix, right = np.zeros((count, 6, 6)), np.zeros((count, 6))
    np.add.at(matrix, corner, np.einsum("tckp,tckq->tcpq", powers, powers))
    np.add.at(right, corner, np.einsum("tckp,tk->tcp", powers, nodal[mesh.triangles]))
    fits = np.einsum("npq,nq->np", np.linalg.pinv(matrix, hermitian=True), right)
    values = np.einsum("tckp,tcp->tk", powers, fits[corner]) / 3
    node = mesh.triangles.ravel()
    return np.bincount(node, values.ravel(), count) / np.maximum(np.bincount(node, minlength=count), 1)


def wall_pieces(flow: DuctFlow) -> np.ndarray:
    """Wall edges (n, k, 2) in the order of the flow's wall shear."""
    return _sampled(flow.mesh.points[flow.mesh.edges[flow.wall_shear.edge]])


def mesh_lines(mesh: Mesh) -> np.ndarray:
    """Sides of the triangles as short lines (n, k, 2), each once."""
    sides = mesh.triangles[:, SIDES].reshape(-1, 3)
    _, first = np.unique(sides[:, 2], return_index=True)
    return _sampled(mesh.points[sides[first]])


def _sampled(nodes):
    """Points (n, k, 2) along parabolic edges given by start, end and middle (n, 3, 2)."""
    return np.stack([edge_points(nodes, s) for s in SIDE_SAMPLES], axis=1)
