"""Checks that triangles tile a section. Meshes from outside pass them once, before anything is solved."""

from __future__ import annotations

import numpy as np
from scipy import sparse
from scipy.sparse import csgraph

from ductsolve.errors import SectionError
from ductsolve.mesh.loops import edge_lengths, enclosed_area, outline_loops
from ductsolve.mesh.triangles import Mesh, cross

# Closer than this part of the shorter edge, two edges touch.
TOUCHING = 1e-6
# A hole with less area than this part of its perimeter squared is a slit left by points that do not match.
SLIT = 1e-5
_PAIRS_AT_ONCE = 1_000_000
_NODES = [(1, 0, 0), (0, 1, 0), (0, 0, 1), (0.5, 0.5, 0), (0, 0.5, 0.5), (0.5, 0, 0.5)]  # barycentric


def place(point) -> str:
    """A point in words, for messages."""
    return f"({point[0]:.6g}, {point[1]:.6g}) m"


def check_mesh(mesh: Mesh) -> None:
    """Refuse, with the place, a mesh that is not one region tiled once by triangles.

    All sides lie between triangles on opposite sides of them, and no two edges of the outline touch. The
    number of triangles over a point is then the winding number of the outline around it, which is 1
    inside when one loop runs counter-clockwise.
    """
    _check_folds(mesh)
    _check_curved(mesh)
    _check_outline(mesh)
    loops = outline_loops(mesh)
    _check_parts(mesh)
    for number, loop in enumerate(loops):
        nodes = mesh.points[mesh.edges[loop]]
        area = enclosed_area(mesh, loop)
        if number and abs(area) < SLIT * edge_lengths(nodes).sum() ** 2:
            raise SectionError(
                f"slit at {place(nodes[0, 0])}: the points of the triangles there do not match"
            )
        if (area > 0) != (number == 0):
            raise SectionError(f"the mesh overlaps itself around {place(nodes[0, 0])}")


def _check_folds(mesh):
    """Two triangles that run along a side in the same direction lie on the same side of it."""
    corners, middles = mesh.triangles[:, :3], mesh.triangles[:, 3:]
    direction = np.where(corners < np.roll(corners, -1, axis=1), 1, -1)
    balance = np.bincount(middles.ravel(), weights=direction.ravel(), minlength=len(mesh.points))
    folded = np.abs(balance) > 1
    if folded.any():
        where = mesh.points[folded.argmax()]
        raise SectionError(f"triangles overlap at {place(where)}: folded, or there twice")


def _check_outline(mesh):
    curved = mesh.curved[mesh.edge_owner]
    straight, halves = mesh.edges[~curved, :2], mesh.edges[curved]
    contact = first_contact(mesh.points, np.vstack([straight, halves[:, [0, 2]], halves[:, [2, 1]]]))
    if contact is None:
        return
    where, crossing = contact
    if crossing:
        raise SectionError(f"the mesh overlaps itself: its outline crosses itself at {place(where)}")
    raise SectionError(f"hanging node at {place(where)}: a corner lies inside a side of another triangle")


def _check_parts(mesh):
    middles = mesh.triangles[:, 3:]
    size = (len(mesh.points),) * 2
    links = np.vstack([middles[:, :2], middles[:, 1:]]).T
    graph = sparse.csr_array((np.ones(links.shape[1]), tuple(links)), shape=size)
    label = csgraph.connected_components(graph, directed=False)[1][middles[:, 0]]
    apart = label != label[0]
    if apart.any():
        here, there = (place(mesh.points[mesh.triangles[k, :3]].mean(axis=0)) for k in (0, apart.argmax()))
        count = len(np.unique(label))
        raise SectionError(f"the mesh has {count} separate parts, one at {here} and one at {there}")


def _check_curved(mesh):
    """The Jacobian determinant of a six-node triangle is a quadratic; its Bernstein coefficients bound it."""
    curved = np.flatnonzero(mesh.curved)
    nodes = mesh.points[mesh.triangles[curved]]
    at_nodes = np.empty((len(curved), 6))
    for k, (a, b, c) in enumerate(_NODES):
        along_a = np.array([4 * a - 1, 0, 0, 4 * b, 0, 4 * c])
        along_b = np.array([0, 4 * b - 1, 0, 4 * a, 4 * c, 0])
        along_c = np.array([0, 0, 4 * c - 1, 0, 4 * b, 4 * a])
        u, v = (along_b - along_a) @ nodes, (along_c - along_a) @ nodes
        at_nodes[:, k] = cross(u, v)
    corners = at_nodes[:, :3]
    sides = 2 * at_nodes[:, 3:] - (corners + np.roll(corners, -1, axis=1)) / 2
    inverted = (np.minimum(corners, sides) <= 0).any(axis=1)
    if inverted.any():
        where = nodes[inverted.argmax(), :3].mean(axis=0)
        raise SectionError(f"a curved side cuts through its triangle at {place(where)}: refine the wall")


# --- segments ---------------------------------------------------------------------------------------


def first_contact(points: np.ndarray, edges: np.ndarray) -> tuple[np.ndarray, bool] | None:
    """Where two straight edges meet other than in an end they share, and whether they cross there.

    Parameters
    ----------
    points : (n_points, 2) [m]
    edges : (n_edges, 2) start and end of each edge
    """
    for i, j in _near_pairs(points, edges):
        crossing, touching, where = contacts(points, edges[i], edges[j])
        found = crossing | touching
        if found.any():
            k = (crossing if crossing.any() else touching).argmax()
            return where[k], bool(crossing[k])
    return None


def contacts(points: np.ndarray, first: np.ndarray, second: np.ndarray):
    """Whether edges first (n, 2) and second (n, 2) cross (n,), or touch (n,), and where (n, 2).

    Edges touch when an end of one that is not an end of the other lies on it, within ``TOUCHING`` of the
    shorter edge.
    """
    a, b, c, d = (points[k] for k in (*first.T, *second.T))
    length = np.minimum(np.linalg.norm(b - a, axis=1), np.linalg.norm(d - c, axis=1))
    ends = np.stack([a, b, c, d], axis=1)
    gaps = np.column_stack(
        [_distance(a, c, d), _distance(b, c, d), _distance(c, a, b), _distance(d, a, b)],
    )
    shared = np.hstack([first, second])
    shared = (shared[:, :, None] == shared[:, None, :]).sum(axis=2) > 1
    gaps[shared] = np.inf
    touching = gaps.min(axis=1) <= TOUCHING * length
    sides = [_turn(a, b, c), _turn(a, b, d), _turn(c, d, a), _turn(c, d, b)]
    crossing = (sides[0] * sides[1] < 0) & (sides[2] * sides[3] < 0) & ~touching
    # Where they cross, the turns at c and d are in proportion to their distances from the line a-b.
    part = sides[0] / np.where(crossing, sides[0] - sides[1], 1)
    at_end = np.take_along_axis(ends, gaps.argmin(axis=1)[:, None, None], axis=1)[:, 0]
    return crossing, touching, np.where(crossing[:, None], c + part[:, None] * (d - c), at_end)


def _near_pairs(points, edges):
    """Batches of pairs of edges whose boxes overlap, found by a sweep across the plane.

    The sweep runs askew, so that the edges of a wall along an axis are met one after the other.
    """
    margin = TOUCHING * np.linalg.norm(points[edges[:, 1]] - points[edges[:, 0]], axis=1)[:, None]
    low, high = points[edges].min(axis=1) - margin, points[edges].max(axis=1) + margin
    along = points[edges] @ np.array([np.cos(1.0), np.sin(1.0)])
    from_, to = along.min(axis=1) - margin[:, 0], along.max(axis=1) + margin[:, 0]
    order = np.argsort(from_)
    count = np.searchsorted(from_[order], to[order], side="right") - np.arange(len(order)) - 1
    batch = np.cumsum(count) // _PAIRS_AT_ONCE
    for number in np.unique(batch):
        rows = np.flatnonzero(batch == number)
        first = np.repeat(rows, count[rows])
        before = np.repeat(np.cumsum(count[rows]) - count[rows], count[rows])
        second = first + 1 + np.arange(len(first)) - before
        i, j = order[first], order[second]
        near = ((low[i] <= high[j]) & (low[j] <= high[i])).all(axis=1)
        yield i[near], j[near]


def _distance(p, a, b):
    """Distance (n,) of points p from segments a-b."""
    along = b - a
    part = np.einsum("nd,nd->n", p - a, along) / np.einsum("nd,nd->n", along, along)
    return np.linalg.norm(p - a - np.clip(part, 0, 1)[:, None] * along, axis=1)


def _turn(a, b, c):
    """Twice the signed area (n,) of triangles a, b, c."""
    return cross(b - a, c - a)
