"""The mesh: six-node triangles, straight inside, following the true curve on curved walls."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ductsolve.errors import SectionError
from ductsolve.mesh.curves import EllipseArc

# Local node numbers along each side: start, end, middle. Side 0 is the one bisected first.
SIDES = np.array([[0, 1, 3], [1, 2, 4], [2, 0, 5]])

SAME_PLACE = 1e-9  # of a section's size: points closer are one, outlines thinner have no area

Curve = EllipseArc | None


@dataclass(frozen=True)
class Boundary:
    """A named part of the outline.

    Attributes
    ----------
    name : what users call it
    symmetry : True on a symmetry line (no shear), False on a wall at rest (no slip)
    curve : the true curve, or None where the mesh edges are the wall
    """

    name: str
    symmetry: bool = False
    curve: Curve = None


@dataclass(frozen=True, eq=False)
class Mesh:
    """Six-node triangles and the outline edges with their names.

    Attributes
    ----------
    points : (n_points, 2) corners and mid-edge nodes [m]
    triangles : (n_triangles, 6) three corners counter-clockwise, then the nodes between corners
        0-1, 1-2 and 2-0; a mid-edge node also stands for its edge, which no other edge shares
    edges : (n_edges, 3) start, end and mid-edge node of every outline edge, section on the left
    edge_boundary : (n_edges,) index of each outline edge into ``boundaries``
    boundaries : the named parts of the outline
    """

    points: np.ndarray
    triangles: np.ndarray
    edges: np.ndarray
    edge_boundary: np.ndarray
    boundaries: tuple[Boundary, ...]

    def __post_init__(self):
        for array in (self.points, self.triangles, self.edges, self.edge_boundary):
            array.setflags(write=False)

    @cached_property
    def symmetry_edges(self) -> np.ndarray:
        """Mask (n_edges,) of the outline edges on symmetry lines."""
        return np.array([b.symmetry for b in self.boundaries])[self.edge_boundary]

    @cached_property
    def wall_edges(self) -> np.ndarray:
        """Outline edges (n, 3) that are walls."""
        return self.edges[~self.symmetry_edges]

    @cached_property
    def edge_owner(self) -> np.ndarray:
        """Triangle (n_edges,) each outline edge belongs to."""
        owner = np.empty(len(self.points), dtype=int)
        for side in (3, 4, 5):
            owner[self.triangles[:, side]] = np.arange(len(self.triangles))
        return owner[self.edges[:, 2]]

    @cached_property
    def curved(self) -> np.ndarray:
        """Mask (n_triangles,) of triangles with a side that is not straight."""
        corners = self.points[self.triangles[:, :3]]
        middles = (corners + np.roll(corners, -1, axis=1)) / 2
        off = np.abs(self.points[self.triangles[:, 3:]] - middles).max(axis=(1, 2))
        size = np.abs(corners - corners[:, :1]).max(axis=(1, 2))
        return off > 1e-12 * size

    @cached_property
    def edge_deviation(self) -> np.ndarray:
        """Largest distance (n_edges,) between each outline edge and the true curve behind it [m].

        The deviation of a parabola from an arc is a smooth quartic of the position; nine samples find
        its largest value to a few percent.
        """
        deviation = np.zeros(len(self.edges))
        for index, boundary in enumerate(self.boundaries):
            chosen = np.flatnonzero(self.edge_boundary == index)
            if boundary.curve is None or not len(chosen):
                continue
            for s in np.linspace(0, 1, 11)[1:-1]:
                at = edge_points(self.points[self.edges[chosen]], s)
                deviation[chosen] = np.maximum(deviation[chosen], boundary.curve.distance(at))
        return deviation


def shapes(barycentric: np.ndarray) -> np.ndarray:
    """Quadratic shape functions (n, 6) of a triangle at barycentric points (n, 3)."""
    a, b, c = barycentric.T
    corners = [a * (2 * a - 1), b * (2 * b - 1), c * (2 * c - 1)]
    return np.column_stack([*corners, 4 * a * b, 4 * b * c, 4 * c * a])


def edge_shapes(s: np.ndarray) -> np.ndarray:
    """Quadratic shape functions (3, n) of an edge's start, end and middle at positions s in [0, 1]."""
    return np.stack([(1 - s) * (1 - 2 * s), s * (2 * s - 1), 4 * s * (1 - s)])


def edge_points(nodes: np.ndarray, s: float) -> np.ndarray:
    """Points (n, 2) at position s in [0, 1] on edges given by start, end and middle, (n, 3, 2)."""
    return np.einsum("k,nkd->nd", edge_shapes(np.float64(s)), nodes)


def cross(u: np.ndarray, v: np.ndarray) -> np.ndarray:
    """Cross product (...) of plane vectors (..., 2)."""
    return u[..., 0] * v[..., 1] - u[..., 1] * v[..., 0]


def signed_areas(points: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """Signed areas (n,) of the straight triangles with corner indices (n, 3) [m2]."""
    a, b, c = (points[corners[:, k]] for k in range(3))
    return cross(b - a, c - a) / 2


def mesh_from_corners(points, corners, boundaries, boundary_of_edge) -> Mesh:
    """Build a six-node mesh from straight triangles.

    Parameters
    ----------
    points : (n, 2) corner coordinates [m]
    corners : (n_triangles, 3) indices, either orientation
    boundaries : named parts of the outline
    boundary_of_edge : function of the outline edges' end points (n, 2, 2) returning the index of the
        boundary each belongs to, (n,)
    """
    points = np.asarray(points, dtype=float)
    corners = oriented(points, np.asarray(corners, dtype=int))
    corners = longest_side_first(points, corners)
    sides = corners[:, SIDES[:, :2]].reshape(-1, 2)
    unique, first, inverse, counts = np.unique(
        np.sort(sides, axis=1), axis=0, return_index=True, return_inverse=True, return_counts=True
    )
    if counts.max() > 2:
        where = points[unique[counts.argmax()]].mean(axis=0)
        raise SectionError(f"three or more triangles share the edge at ({where[0]:.6g}, {where[1]:.6g}) m")
    middle = len(points) + np.arange(len(unique))
    triangles = np.hstack([corners, middle[inverse].reshape(-1, 3)])
    outer = np.flatnonzero(counts == 1)
    edges = np.column_stack([sides[first[outer]], middle[outer]])
    edge_boundary = np.asarray(boundary_of_edge(points[edges[:, :2]]), dtype=int)
    all_points = np.vstack([points, points[unique].mean(axis=1)])
    all_points = fit_to_curves(all_points, edges, edge_boundary, boundaries)
    return Mesh(all_points, triangles, edges, edge_boundary, tuple(boundaries))


def oriented(points, corners):
    """Corners turned counter-clockwise; refuses triangles without area, naming the place."""
    area = signed_areas(points, corners)
    size = np.ptp(points[corners], axis=1).max(axis=1)
    flat = np.abs(area) <= 1e-14 * size**2
    if flat.any():
        where = points[corners[flat][0]].mean(axis=0)
        raise SectionError(f"the triangle at ({where[0]:.6g}, {where[1]:.6g}) m has no area")
    return np.where((area < 0)[:, None], corners[:, ::-1], corners)


def longest_side_first(points, corners):
    """Corners rotated so that the longest side lies between the first two: it is bisected first."""
    length = np.linalg.norm(points[corners] - points[np.roll(corners, -1, axis=1)], axis=2)
    # Ties go to the first side within rounding, so that mirrored meshes refine alike.
    start = np.argmax(length > length.max(axis=1, keepdims=True) * (1 - 1e-9), axis=1)
    return np.take_along_axis(corners, (start[:, None] + np.arange(3)) % 3, axis=1)


def fit_to_curves(points, edges, edge_boundary, boundaries):
    """Points with the corners of curved edges on the curve and their middles fitted to it."""
    points = points.copy()
    for index, boundary in enumerate(boundaries):
        if boundary.curve is None:
            continue
        start, end, middle = edges[edge_boundary == index].T
        points[start] = boundary.curve.project(points[start])
        points[end] = boundary.curve.project(points[end])
        points[middle] = boundary.curve.mid_nodes(points[start], points[end])
    return points
