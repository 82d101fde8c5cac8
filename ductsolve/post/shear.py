"""Shear stress inside the section."""

from __future__ import annotations

import numpy as np

from ductsolve.mesh.triangles import Mesh
from ductsolve.solver.flow import DuctFlow
from ductsolve.solver.quadratic import Elements, corner_rule


def nodal_shear_stress(flow: DuctFlow) -> np.ndarray:
    """Size of the balanced shear stress (n_points,) at the points of ``flow.mesh`` [Pa].

    The stress has a value for each triangle at a node; their mean is taken, as vectors, and no stress
    crosses a symmetry line.
    """
    mesh = flow.level.mesh
    rule = corner_rule(1)  # its six points are the nodes, in another order
    stress = flow.level.stress(flow.psi, Elements(mesh, rule))[:, :, rule.values.argmax(axis=0)]
    node = mesh.triangles.ravel()
    shares = np.bincount(node)
    mean = np.stack([np.bincount(node, component.ravel()) / shares for component in stress], axis=1)
    _keep_to_symmetry_lines(mesh, mean)
    return flow.pressure_gradient * flow.whole.nodal(np.hypot(*mean.T)[mesh.triangles])


def _keep_to_symmetry_lines(mesh: Mesh, vectors: np.ndarray) -> None:
    """Turn vectors (n_points, 2) on symmetry lines along them; where two lines meet nothing is left."""
    visits = np.zeros(len(mesh.points), dtype=int)
    for index, boundary in enumerate(mesh.boundaries):
        edges = mesh.edges[mesh.edge_boundary == index]
        if not boundary.symmetry or not len(edges):
            continue
        nodes = np.unique(edges)
        along = mesh.points[edges[0, 1]] - mesh.points[edges[0, 0]]
        along /= np.linalg.norm(along)
        vectors[nodes] = np.outer(vectors[nodes] @ along, along)
        visits[nodes] += 1
    vectors[visits > 1] = 0.0
