"""The whole section from copies of the part that is solved."""

from __future__ import annotations

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from ductsolve.mesh.sections import Section
from ductsolve.mesh.triangles import SAME_PLACE, Mesh
from ductsolve.solver.fields import Level

# Local node order of a mirrored triangle, counter-clockwise again.
MIRRORED = np.array([1, 0, 2, 3, 5, 4])


class Whole:
    """Mesh of the whole section and where its nodes come from.

    Attributes
    ----------
    mesh : all copies joined on the symmetry lines; of these only the lines of an only copy remain
    """

    def __init__(self, section: Section, level: Level):
        part, copies = level.mesh, section.copies
        self._level, self._count = level, len(part.points)
        points = np.vstack([part.points @ m[:, :2].T + m[:, 2] for m in copies])
        number, first = _joined(points, part, len(copies))
        self._source = first % self._count
        mirrored = np.linalg.det(copies[:, :, :2]) < 0
        kept = np.flatnonzero(~part.symmetry_edges) if len(copies) > 1 else slice(None)
        triangles, edges = [], []
        for k, turned in enumerate(mirrored):
            own = number[k * self._count : (k + 1) * self._count]
            triangles.append(own[part.triangles[:, MIRRORED] if turned else part.triangles])
            edges.append(own[part.edges[kept][:, [1, 0, 2]] if turned else part.edges[kept]])
        self.mesh = Mesh(
            points[first],
            np.vstack(triangles),
            np.vstack(edges),
            np.tile(part.edge_boundary[kept], len(copies)),
            part.boundaries,
        )

    def nodal(self, local: np.ndarray) -> np.ndarray:
        """Values at the nodes of ``mesh`` from local values (n_triangles, 6) on the part."""
        return self._level.nodal(local)[self._source]


def _joined(points, part, copies):
    """Number of each copied node in the joined mesh, and the copied node each number stands for."""
    count = len(part.points)
    on_line = np.unique(part.edges[part.symmetry_edges])
    if not len(on_line):
        return np.arange(len(points)), np.arange(len(points))
    shared = (on_line + count * np.arange(copies)[:, None]).ravel()
    tree = cKDTree(points[shared])
    pairs = shared[tree.query_pairs(SAME_PLACE * np.ptp(points, axis=0).max(), output_type="ndarray")]
    links = coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), (len(points),) * 2)
    _, number = connected_components(links, directed=False)
    _, first = np.unique(number, return_index=True)
    return number, first
