"""Shear stress and shear rate inside the section."""

from __future__ import annotations

import numpy as np

from ductsolve.mesh.triangles import Mesh
from ductsolve.solver.bracket import size
from ductsolve.solver.flow import DuctFlow
from ductsolve.solver.quadratic import Elements, corner_rule, gauss

IDLE_SHARE = 0.01  # of the dissipated power: shear rates below these contribute nothing worth a warning
TOP_SHARE = 0.001  # ... and above these lie only re-entrant corners, where the rate is unbounded


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


def working_rates(flow: DuctFlow) -> np.ndarray:
    """Shear rates [1/s] at which all but a hundredth of the power is dissipated, rising."""
    elements = Elements(flow.level.mesh, gauss(3))
    stress = flow.pressure_gradient * size(flow.level.stress(flow.psi, elements)).ravel()
    rate = np.asarray(flow.fluid.rate(stress))
    order = np.argsort(rate)
    power = np.cumsum((rate * stress * elements.weights.ravel())[order])
    kept = (power >= IDLE_SHARE * power[-1]) & (power <= (1 - TOP_SHARE) * power[-1])
    return rate[order][kept]


def beyond_table(flow: DuctFlow) -> str | None:
    """How far a tabulated flow curve is extrapolated, as a sentence; None where it is not."""
    reach = getattr(flow.fluid, "reach", None)
    return reach(working_rates(flow)) if reach is not None and flow.flow_rate > 0 else None
