"""Six-node triangles: shape functions, quadrature, gradients and integrals, vectorised over the mesh."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache, cached_property

import numpy as np

from ductsolve.mesh.triangles import Mesh, shapes


@dataclass(frozen=True, eq=False)
class Rule:
    """Quadrature points on the reference triangle (0,0), (1,0), (0,1) with everything tabulated there.

    Attributes
    ----------
    points : (n, 2) reference coordinates
    weights : (n,) summing to 1/2, the reference area
    values : (n, 6) shape functions
    slopes : (6, 2 n) their reference gradients, components beside each other
    products : (3 n, 36) products of reference gradients for the coefficients D11, D12, D22
    """

    points: np.ndarray
    weights: np.ndarray
    values: np.ndarray
    slopes: np.ndarray
    products: np.ndarray


def _tabulate(points, weights):
    b, c = points.T
    a = 1 - b - c
    values = shapes(np.column_stack([a, b, c]))
    zero = np.zeros_like(a)
    along = np.column_stack([1 - 4 * a, 4 * b - 1, zero, 4 * (a - b), 4 * c, -4 * c])
    across = np.column_stack([1 - 4 * a, zero, 4 * c - 1, -4 * b, 4 * b, 4 * (a - c)])
    slopes = np.concatenate([along, across]).T
    mixed = np.einsum("qi,qj->qij", along, across)
    products = np.stack(
        [
            np.einsum("qi,qj->qij", along, along),
            mixed + mixed.transpose(0, 2, 1),
            np.einsum("qi,qj->qij", across, across),
        ]
    )
    return Rule(points, np.asarray(weights), values, slopes, products.reshape(3 * len(a), 36))


@cache
def gauss(order: int) -> Rule:
    """Conical product Gauss rule with order x order points, exact to degree 2 order - 1.

    Source: Stroud (1971), conical product formulas; the collapsed direction carries the weight 1 - x.
    """
    # The weight 1 - x is absorbed by one more Legendre point instead of Jacobi's rule.
    x, wx = np.polynomial.legendre.leggauss(order + 1)
    y, wy = np.polynomial.legendre.leggauss(order)
    x, y = np.meshgrid((x + 1) / 2, (y + 1) / 2, indexing="ij")
    weights = np.outer(wx, wy) / 4 * (1 - x)
    points = np.column_stack([x.ravel(), (y * (1 - x)).ravel()])
    return _tabulate(points, weights.ravel())


@cache
def interior() -> Rule:
    """Six points, exact to degree 4: the rule the equations are assembled with.

    Source: Strang & Fix (1973), table 4.1.
    """
    p, q = 0.091576213509771, 0.445948490915965
    u, v = 0.109951743655322 / 2, 0.223381589678011 / 2
    points = [(p, p), (1 - 2 * p, p), (p, 1 - 2 * p), (q, q), (1 - 2 * q, q), (q, 1 - 2 * q)]
    return _tabulate(np.array(points), [u, u, u, v, v, v])


@cache
def corner_rule(level: int) -> Rule:
    """Corner rule on ``4**level`` equal parts: never below the integral of a convex function."""
    n = 2**level
    points, weights = [], []
    for i in range(n + 1):
        for j in range(n + 1 - i):
            touching = {0: 6, 1: 3}.get((i == 0) + (j == 0) + (i + j == n), 1)
            points.append((i / n, j / n))
            weights.append(touching / (6 * n**2))
    return _tabulate(np.array(points), weights)


@cache
def subdivided(rule: Rule, depth: int) -> Rule:
    """The rule repeated on each of ``4**depth`` equal parts of the reference triangle."""
    n = 2**depth
    i, j = (a.ravel() for a in np.meshgrid(np.arange(n), np.arange(n), indexing="ij"))
    upright = np.column_stack([i, j])[i + j < n]
    inverted = np.column_stack([i, j])[i + j < n - 1] + 1
    points = np.vstack([(c + s * rule.points) / n for cs, s in ((upright, 1), (inverted, -1)) for c in cs])
    return _tabulate(points, np.tile(rule.weights / n**2, n**2))


class Elements:
    """Geometry of a mesh's triangles, or of some of them, at the points of a rule.

    Attributes
    ----------
    nodes : (n_triangles, 6, 2) [m]
    weights : (n_triangles, n) quadrature weight times area factor [m2]
    """

    def __init__(self, mesh: Mesh, rule: Rule, chosen=slice(None)):
        self.nodes = nodes = mesh.points[mesh.triangles[chosen]]
        self.rule, self.count, self.points = rule, len(nodes), len(rule.weights)
        x1, x2 = self._reference(nodes[..., 0])
        y1, y2 = self._reference(nodes[..., 1])
        determinant = x1 * y2 - x2 * y1
        self.weights = rule.weights * determinant
        # Rows of the inverse of the derivative of position: gradients of the reference coordinates.
        self._b = (y2 / determinant, -x2 / determinant)
        self._c = (-y1 / determinant, x1 / determinant)

    def _reference(self, local):
        """Reference gradient components, each (n_triangles, n), of local values (n_triangles, 6)."""
        both = local @ self.rule.slopes
        return both[:, : self.points], both[:, self.points :]

    def gradient(self, local: np.ndarray) -> np.ndarray:
        """Gradient (2, n_triangles, n) of local nodal values (n_triangles, 6)."""
        along, across = self._reference(local)
        return np.stack([along * self._b[i] + across * self._c[i] for i in (0, 1)])

    def integral(self, field: np.ndarray) -> np.ndarray:
        """Integral (n_triangles,) of a field (n_triangles, n) over each triangle."""
        return np.einsum("tq,tq->t", self.weights, field)

    def value(self, local: np.ndarray) -> np.ndarray:
        """Values (n_triangles, n) of local nodal values (n_triangles, 6)."""
        return local @ self.rule.values.T

    @cached_property
    def position(self) -> np.ndarray:
        """Coordinates (2, n_triangles, n) of the points [m]."""
        return np.stack([self.value(self.nodes[..., i]) for i in (0, 1)])

    @cached_property
    def unit_load(self) -> np.ndarray:
        """Integral (n_triangles, 6) of each shape function."""
        return self.weights @ self.rule.values

    def load(self, field: np.ndarray) -> np.ndarray:
        """Integral (n_triangles, 6) of a vector field (2, n_triangles, n) dotted with each gradient."""
        parts = [(field[0] * d[0] + field[1] * d[1]) * self.weights for d in (self._b, self._c)]
        return np.hstack(parts) @ self.rule.slopes.T

    def stiffness(self, tensor) -> np.ndarray:
        """Integral (n_triangles, 36) of gradient . tensor gradient for a symmetric tensor (11, 12, 22)."""
        d11, d12, d22 = tensor
        (b0, b1), (c0, c1) = self._b, self._c
        p0, p1 = d11 * b0 + d12 * b1, d12 * b0 + d22 * b1
        q0, q1 = d11 * c0 + d12 * c1, d12 * c0 + d22 * c1
        pulled = np.hstack(
            [
                (p0 * b0 + p1 * b1) * self.weights,
                (p0 * c0 + p1 * c1) * self.weights,
                (q0 * c0 + q1 * c1) * self.weights,
            ]
        )
        return pulled @ self.rule.products
