"""The outline of a mesh: its closed loops, the length of its edges and the area they enclose."""

from __future__ import annotations

import numpy as np

from ductsolve.errors import SectionError
from ductsolve.mesh.triangles import Mesh, cross, signed_areas

# The speed along a parabola is the root of a quadratic: 20 Gauss points leave an error of 4e-13 where
# the sagitta is 0.4 of the chord, and rounding only on anything flatter.
_GAUSS = np.polynomial.legendre.leggauss(20)


def outline_loops(mesh: Mesh) -> list[np.ndarray]:
    """Closed loops of the outline, walls and symmetry lines alike: the outer one, then the holes.

    Returns
    -------
    list of arrays of indices into ``mesh.edges``, each ordered head to tail with the section on the left;
    holes come from left to right. Their number less one is the number of holes.

    Raises
    ------
    SectionError : when the section is pinched to a point
    """
    start, end = mesh.edges[:, 0], mesh.edges[:, 1]
    leaving = np.bincount(start, minlength=len(mesh.points))
    if (leaving > 1).any():
        x, y = mesh.points[leaving.argmax()]
        raise SectionError(f"triangles meet only in a corner at ({x:.6g}, {y:.6g}) m: join them by a side")
    edge_from = np.empty(len(mesh.points), dtype=int)
    edge_from[start] = np.arange(len(start))
    loops = _cycles(edge_from[end])
    outer = max(range(len(loops)), key=lambda k: abs(enclosed_area(mesh, loops[k])))
    size = np.ptp(mesh.points, axis=0).max()
    holes = loops[:outer] + loops[outer + 1 :]
    return [loops[outer], *sorted(holes, key=lambda loop: _leftmost(mesh.points[start[loop]], size))]


def _cycles(following):
    """Cycles of a permutation given as the item that follows each."""
    following = following.tolist()
    seen = [False] * len(following)
    cycles = []
    for first in range(len(following)):
        cycle, item = [], first
        while not seen[item]:
            seen[item] = True
            cycle.append(item)
            item = following[item]
        if cycle:
            cycles.append(np.array(cycle))
    return cycles


def _leftmost(points, size):
    """Leftmost point, lowest if there are several, rounded so that rounding errors do not sort."""
    return min(map(tuple, np.round(points / size, 9)))


def enclosed_area(mesh: Mesh, loop: np.ndarray) -> float:
    """Area [m2] enclosed by a closed loop of outline edges, negative around a hole."""
    nodes = mesh.points[mesh.edges[loop]]
    return float(edge_areas(nodes - nodes[0, 0]).sum())


def edge_areas(nodes: np.ndarray) -> np.ndarray:
    """Signed areas (n,) swept from the origin along parabolic edges [m2].

    Parameters
    ----------
    nodes : (n, 3, 2) start, end and middle of each edge [m]

    The triangle from the origin to the chord, and the parabola's 2/3 chord x sagitta beyond it. Summed
    over a closed loop they give the enclosed area exactly.
    """
    start, end, middle = nodes[:, 0], nodes[:, 1], nodes[:, 2]
    return cross(start, end) / 2 + 2 / 3 * cross(middle - start, end - middle)


def edge_lengths(nodes: np.ndarray) -> np.ndarray:
    """Lengths (n,) of parabolic edges given by start, end and middle, (n, 3, 2) [m]."""
    start, end, middle = nodes[:, 0], nodes[:, 1], nodes[:, 2]
    bend = 4 * (start + end - 2 * middle)
    total = np.zeros(len(nodes))
    for at, weight in zip(*_GAUSS, strict=True):
        total += weight / 2 * np.linalg.norm(end - start + at / 2 * bend, axis=1)
    return total


def centroid(mesh: Mesh) -> np.ndarray:
    """Centroid (2,) of the straight triangles [m]."""
    corners = mesh.triangles[:, :3]
    areas = signed_areas(mesh.points, corners)
    return areas @ mesh.points[corners].mean(axis=1) / areas.sum()
