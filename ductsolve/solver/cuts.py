"""Cuts from holes to the outer outline, across which the stress function jumps."""

from __future__ import annotations

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import breadth_first_order

from ductsolve.mesh.loops import outline_loops
from ductsolve.mesh.triangles import SIDES, Mesh


def hole_cuts(mesh: Mesh) -> np.ndarray | None:
    """Local values (n_triangles, 6, n_holes) of a unit jump around each hole; None without holes.

    Along a strip of triangles from the hole to the outer outline the values fall from 1 on its one side
    to 0 on its other; elsewhere they are 0. Neighbours then differ by a constant along the side they
    share, so that the force through it is the same from both, and the sum around the hole is 1.
    """
    outer, *holes = outline_loops(mesh)
    if not holes:
        return None
    neighbours = _neighbours(mesh)
    goals = mesh.edge_owner[outer]
    cuts = np.zeros((len(mesh.triangles), 6, len(holes)))
    for k, hole in enumerate(holes):
        strip = _strip(neighbours, mesh.edge_owner[hole[0]], goals)
        last = outer[goals == strip[-1]][0]
        _fill(cuts[..., k], mesh, strip, mesh.edges[hole[0]], mesh.edges[last])
    return cuts


def _neighbours(mesh):
    """Sparse matrix of triangles that share a side."""
    middles = mesh.triangles[:, 3:].ravel()
    owner = np.repeat(np.arange(len(mesh.triangles)), 3)
    touching = csr_array((np.ones(len(owner)), (owner, middles)), (len(mesh.triangles), len(mesh.points)))
    return touching @ touching.T


def _strip(neighbours, start, goals):
    """Triangles from ``start`` to the nearest of ``goals``, each next to the one before."""
    order, before = breadth_first_order(neighbours, start, directed=False)
    at = order[np.isin(order, goals)][0]
    strip = [at]
    while at != start:
        at = before[at]
        strip.append(at)
    return strip[::-1]


def _fill(values, mesh, strip, first_edge, last_edge):
    """Walk the strip: every side crossed joins a node of value 1 to one of value 0."""
    label = {first_edge[0]: 1.0, first_edge[1]: 0.0}
    for here, following in zip(strip, [*strip[1:], None], strict=True):
        nodes = mesh.triangles[here]
        shared = (
            last_edge[2] if following is None else np.intersect1d(nodes[3:], mesh.triangles[following, 3:])[0]
        )
        ends = nodes[SIDES[np.flatnonzero(nodes[3:] == shared)[0], :2]]
        known = [node for node in ends if node in label]
        fresh = [node for node in nodes[:3] if node not in label][0]
        label[fresh] = 1.0 - label[known[0]]
        corners = np.array([label[node] for node in nodes[:3]])
        values[here] = np.concatenate([corners, (corners + np.roll(corners, -1)) / 2])
        label = {node: label[node] for node in ends}
