"""Newest-vertex bisection of six-node triangles, vectorised over the mesh.

Source: Funken, Praetorius & Wissgott (2011), with the mid-edge node as the name of its edge, so that no
table of edges is needed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import sparse

from ductsolve.mesh.triangles import SIDES, Mesh, fit_to_curves, shapes


@dataclass(frozen=True, eq=False)
class Refinement:
    """A refined mesh and how it descends from the old one.

    Attributes
    ----------
    mesh : the refined mesh
    prolongation : sparse (n_points_new, n_points_old), quadratic interpolation of nodal values
    parent : (n_triangles_new,) old triangle each new one lies in
    local : (n_triangles_new, 6, 6) the same interpolation from the parent's own six values
    """

    mesh: Mesh
    prolongation: sparse.csr_array
    parent: np.ndarray
    local: np.ndarray


def _child_nodes(corners):
    """Interpolation (6, 6) from a triangle's nodes to those of a child with barycentric corners."""
    a, b, c = np.asarray(corners, dtype=float)
    return shapes(np.array([a, b, c, (a + b) / 2, (b + c) / 2, (c + a) / 2]))


# Bisecting side 0 of (c0, c1, c2) at m gives (c2, c0, m) and (c1, c2, m).
_FIRST = _child_nodes([[0, 0, 1], [1, 0, 0], [0.5, 0.5, 0]])
_SECOND = _child_nodes([[0, 1, 0], [0, 0, 1], [0.5, 0.5, 0]])
_QUARTER = np.array([3 / 8, -1 / 8, 3 / 4])  # value at a quarter of an edge from start, end, middle
_INNER = _FIRST[5]  # middle of the new side between m and c2


def bisect(mesh: Mesh, marked: np.ndarray) -> Refinement:
    """Bisect the marked triangles (mask (n_triangles,)) twice, and whatever conformity asks for."""
    split = _closure(mesh, marked)
    builder = _Builder(mesh, split)
    triangles, parent = mesh.triangles, np.arange(len(mesh.triangles))
    local = np.broadcast_to(np.eye(6), (len(triangles), 6, 6))
    for _ in range(2):
        triangles, parent, local = builder.halve(triangles, parent, local)
    edges, edge_boundary = builder.outline()
    prolongation = builder.prolongation()
    points = fit_to_curves(prolongation @ mesh.points, edges, edge_boundary, mesh.boundaries)
    inner, start, end = np.hstack(builder.inner_sides)
    points[inner] = (points[start] + points[end]) / 2  # sides inside stay straight next to curved ones
    return Refinement(
        Mesh(points, triangles, edges, edge_boundary, mesh.boundaries), prolongation, parent, local
    )


def _closure(mesh, marked):
    """Mask (n_points,) of the mid-edge nodes at which to split: every side of a marked triangle, and
    side 0 of each triangle that has any side split."""
    split = np.zeros(len(mesh.points), dtype=bool)
    split[mesh.triangles[marked, 3:]] = True
    while True:
        need = split[mesh.triangles[:, 4:]].any(axis=1) & ~split[mesh.triangles[:, 3]]
        if not need.any():
            return split
        split[mesh.triangles[need, 3]] = True


class _Builder:
    """Collects the new nodes of one refinement as rows of (old nodes, weights)."""

    def __init__(self, mesh, split):
        self.mesh, self.split = mesh, split
        self.count = len(mesh.points)
        self.columns, self.weights, self.inner_sides = [], [], []
        sides = mesh.triangles[:, SIDES].reshape(-1, 3)
        sides = sides[split[sides[:, 2]]]
        # One row per edge: the last writer wins, whichever triangle it is.
        ends = np.zeros((self.count, 2), dtype=int)
        ends[sides[:, 2]] = np.sort(sides[:, :2], axis=1)
        middle = np.flatnonzero(split)
        low, high = ends[middle].T
        self.low = np.full(self.count, -1)
        self.low[middle] = self._add(np.column_stack([low, high, middle]), _QUARTER)
        self.high = np.full(self.count, -1)
        self.high[middle] = self._add(np.column_stack([high, low, middle]), _QUARTER)

    def _add(self, columns, weights):
        """Append new nodes interpolated from old ones; returns their numbers."""
        if weights.ndim == 1:
            weights = np.broadcast_to(weights, columns.shape)
        pad = ((0, 0), (0, 6 - columns.shape[1]))
        self.columns.append(np.pad(columns, pad))
        self.weights.append(np.pad(weights, pad))
        new = self.count + np.arange(len(columns))
        self.count += len(columns)
        return new

    def _quarter(self, middle, start, end):
        """Node between ``start`` and the split edge's middle."""
        return np.where(start < end, self.low[middle], self.high[middle])

    def halve(self, triangles, parent, local):
        """Bisect side 0 wherever its middle is split and it is a side of the old mesh."""
        old = np.where(triangles[:, 3] < len(self.split), triangles[:, 3], 0)
        cut = self.split[old] & (triangles[:, 3] < len(self.split))
        c0, c1, c2, m, m1, m2 = triangles[cut].T
        inner = self._add(self.mesh.triangles[parent[cut]], _INNER @ local[cut])
        self.inner_sides.append(np.array([inner, m, c2]))
        first = np.column_stack([c2, c0, m, m2, self._quarter(m, c0, c1), inner])
        second = np.column_stack([c1, c2, m, m1, inner, self._quarter(m, c1, c0)])
        return (
            np.vstack([triangles[~cut], first, second]),
            np.concatenate([parent[~cut], parent[cut], parent[cut]]),
            np.concatenate([local[~cut], _FIRST @ local[cut], _SECOND @ local[cut]]),
        )

    def outline(self):
        """Outline edges and their boundaries after the split."""
        edges, tags = self.mesh.edges, self.mesh.edge_boundary
        cut = self.split[edges[:, 2]]
        start, end, middle = edges[cut].T
        first = np.column_stack([start, middle, self._quarter(middle, start, end)])
        second = np.column_stack([middle, end, self._quarter(middle, end, start)])
        return np.vstack([edges[~cut], first, second]), np.concatenate([tags[~cut], tags[cut], tags[cut]])

    def prolongation(self):
        """Interpolation from old nodal values to all nodes."""
        old = len(self.mesh.points)
        columns, weights = np.vstack(self.columns), np.vstack(self.weights)
        rows = np.repeat(np.arange(old, self.count), columns.shape[1])
        entries = (
            np.concatenate([np.ones(old), weights.ravel()]),
            (np.concatenate([np.arange(old), rows]), np.concatenate([np.arange(old), columns.ravel()])),
        )
        return sparse.csr_array(entries, shape=(self.count, old))
