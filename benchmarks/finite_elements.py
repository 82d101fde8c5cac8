"""The same duct problem on a general-purpose finite-element library (scikit-fem), as a fair opponent.

It minimises int F(sqrt(|grad w|^2 + smoothing^2)) - G int w over continuous velocities of degree 1 or 2 by
Newton's method with a line search, the smoothing lowered step by step. What a competent user would do is
done: coefficients are evaluated once a step and not once a pair of shape functions, curved walls get
isoparametric triangles, straight ones the cheaper affine map, the sparse LU the same three options as
ductsolve's, and finer meshes may start from coarser ones. It guarantees nothing.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.linalg import splu
from scipy.spatial import cKDTree
from skfem import Basis, BilinearForm, ElementTriP1, ElementTriP2, LinearForm, MeshTri, MeshTri2

from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.triangles import Mesh
from ductsolve.rheology.fluid import Fluid

MOST_STEPS = 40
SUFFICIENT = 1e-4  # part of the predicted gain that a step must bring (Armijo)
QUADRATURE = {1: 1, 2: 2}  # degree of the rule for elements of degree 1 and 2
ROUGH = 1e-2  # relative gain at which the next, smaller smoothing is taken


@BilinearForm
def _stiffness(u, v, w):
    (ux, uy), (vx, vy) = u.grad, v.grad
    return (w.xx * ux + w.xy * uy) * vx + (w.xy * ux + w.yy * uy) * vy


@LinearForm
def _divergence(v, w):
    return w.x1 * v.grad[0] + w.x2 * v.grad[1]


@LinearForm
def _load(v, _):
    return 1.0 * v


@dataclass(frozen=True, eq=False)
class Grid:
    """One mesh in the library's form.

    Attributes
    ----------
    mesh : scikit-fem mesh
    degree : of the elements, 1 or 2
    node : (n_unknowns,) node of ductsolve's mesh behind each unknown
    on_wall : (n_unknowns,) mask
    middles : (n, 3) the nodes in the middle of sides and the ends of these sides, of ductsolve's mesh
    prolongation : interpolation of nodal values from the mesh before, None on the first
    """

    mesh: MeshTri
    degree: int
    node: np.ndarray
    on_wall: np.ndarray
    middles: np.ndarray
    prolongation: csr_array | None


def uniform(mesh: Mesh):
    """Ever finer meshes: all triangles quartered. Yields (mesh, interpolation from the one before)."""
    yield mesh, None
    while True:
        step = bisect(mesh, np.ones(len(mesh.triangles), dtype=bool))
        mesh = step.mesh
        yield mesh, step.prolongation


def graded(mesh: Mesh, corner=None, extra: int = 1):
    """The same, with triangles at the walls (or at one corner) quartered ``extra`` more times each round."""
    yield mesh, None
    while True:
        step = bisect(mesh, np.ones(len(mesh.triangles), dtype=bool))
        mesh, prolongation = step.mesh, step.prolongation
        for _ in range(extra):
            step = bisect(mesh, _touching(mesh, corner))
            mesh, prolongation = step.mesh, step.prolongation @ prolongation
        yield mesh, prolongation


def _touching(mesh, corner):
    """Mask of the triangles with a node on a wall, or at the corner."""
    near = np.zeros(len(mesh.points), dtype=bool)
    if corner is None:
        near[mesh.wall_edges] = True
    else:
        near[np.linalg.norm(mesh.points - corner, axis=1).argmin()] = True
    return near[mesh.triangles].any(axis=1)


def grid(mesh: Mesh, degree: int, prolongation=None) -> Grid:
    """Hand a mesh over to the library (not timed)."""
    corners, numbered = np.unique(mesh.triangles[:, :3], return_inverse=True)
    triangles = numbered.reshape(-1, 3)
    library_mesh = MeshTri(
        np.ascontiguousarray(mesh.points[corners].T), np.ascontiguousarray(triangles.T), validate=False
    )
    middles = _middles(mesh)
    straight = mesh.points.copy()
    straight[middles[:, 0]] = straight[middles[:, 1:]].mean(axis=1)
    lookup = cKDTree(straight)
    if degree == 2:
        quadratic = MeshTri2.from_mesh(library_mesh)
        node = lookup.query(quadratic.doflocs.T)[1]
        if mesh.curved.any():
            library_mesh = replace(quadratic, doflocs=np.ascontiguousarray(mesh.points[node].T))
    else:
        node = corners
    on_wall = np.isin(node, mesh.wall_edges)
    return Grid(library_mesh, degree, node, on_wall, middles, prolongation)


def _middles(mesh):
    """Rows (middle, end, end) of all sides."""
    t = mesh.triangles
    return np.vstack([t[:, [3, 0, 1]], t[:, [4, 1, 2]], t[:, [5, 2, 0]]])


def moved(values: np.ndarray, coarse: Grid, fine: Grid) -> np.ndarray:
    """Velocity interpolated from one grid to the next finer one."""
    nodal = np.zeros(fine.prolongation.shape[1])
    nodal[coarse.node] = values
    if coarse.degree == 1:
        middle, *ends = coarse.middles.T
        nodal[middle] = (nodal[ends[0]] + nodal[ends[1]]) / 2
    return (fine.prolongation @ nodal)[fine.node]


class Problem:
    """Discrete energy on one grid and its minimisation."""

    def __init__(self, grid: Grid, fluid: Fluid, gradient: float):
        element = (ElementTriP1, ElementTriP2)[grid.degree - 1]()
        self.basis = Basis(grid.mesh, element, intorder=QUADRATURE[grid.degree])
        self.fluid = fluid
        self.load = gradient * _load.assemble(self.basis)
        self.gradient = gradient
        self.free = np.flatnonzero(~grid.on_wall)
        self.steps = 0

    def flow(self, velocity: np.ndarray) -> float:
        """Flow rate through the part that is solved [m3/s]."""
        return float(self.load @ velocity) / self.gradient

    def newtonian(self, viscosity: float) -> np.ndarray:
        """Velocity of a Newtonian fluid: the start for every other."""
        one = np.full(self.basis.dx.shape, viscosity)
        self.steps += 1
        return self._solve(one, np.zeros_like(one), one, self.load)

    def relax(self, velocity: np.ndarray, smoothing: float, stop: float) -> np.ndarray:
        """Newton until the predicted gain is at most ``stop`` times the energy."""
        size, rate = self._rates(velocity, smoothing)
        energy = self._energy(velocity, size)
        for _ in range(MOST_STEPS):
            self.steps += 1
            viscosity = self.fluid.stress(size) / size
            bend = (self.fluid.local_exponent(size) - 1) * viscosity / size**2
            force = _divergence.assemble(self.basis, x1=viscosity * rate[0], x2=viscosity * rate[1])
            xx, yy = (viscosity + bend * r**2 for r in rate)
            change = self._solve(xx, bend * rate[0] * rate[1], yy, self.load - force)
            predicted = float((self.load - force) @ change)
            step, before = 1.0, energy
            while True:
                size, rate = self._rates(velocity + step * change, smoothing)
                energy = self._energy(velocity + step * change, size)
                if energy <= before - SUFFICIENT * step * predicted or step < 1e-6:
                    break
                step /= 2
            velocity = velocity + step * change
            if predicted <= stop * abs(energy) or step < 1e-6:
                break
        return velocity

    def _rates(self, velocity, smoothing):
        """Smoothed shear rate and the velocity's gradient at the points of quadrature."""
        rate = self.basis.interpolate(velocity).grad
        return np.sqrt(rate[0] ** 2 + rate[1] ** 2 + smoothing**2), rate

    def _energy(self, velocity, size):
        return float(np.sum(self.fluid.potential(size) * self.basis.dx) - self.load @ velocity)

    def _solve(self, xx, xy, yy, load):
        """Velocity of one linear system, zero on the walls."""
        matrix = _stiffness.assemble(self.basis, xx=xx, xy=xy, yy=yy)
        matrix = matrix[self.free][:, self.free].tocsc()
        factors = splu(
            matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
        )
        velocity = np.zeros(len(load))
        velocity[self.free] = factors.solve(load[self.free])
        return velocity


@dataclass(frozen=True)
class Setting:
    """How one solve goes about it.

    Attributes
    ----------
    smoothing : last one, relative to the nominal shear rate; it starts at 1
    ratio : from one smoothing to the next; one is taken on each coarser mesh, all that remain on the last
    coarser : number of coarser meshes to start from
    """

    smoothing: float
    ratio: float
    coarser: int


def solve(grids: list[Grid], fluid: Fluid, gradient: float, rate: float, setting: Setting, stop: float):
    """Flow rate on the last grid by the setting, and the number of linear systems solved on all.

    ``rate`` is the nominal shear rate [1/s]: the scale of the smoothing.
    """
    *coarse, fine = grids[max(len(grids) - 1 - setting.coarser, 0) :]
    smoothing, steps, before, velocity = 1.0, 0, None, None
    for grid in (*coarse, fine):
        problem = Problem(grid, fluid, gradient)
        if velocity is None:
            velocity = problem.newtonian(float(fluid.stress(rate)) / rate)
        else:
            velocity = moved(velocity, before, grid)
        while True:
            last = smoothing <= setting.smoothing
            final = last and grid is fine
            velocity = problem.relax(velocity, smoothing * rate, stop if final else ROUGH)
            smoothing = max(smoothing * setting.ratio, setting.smoothing)
            if final or grid is not fine:
                break
        before, steps = grid, steps + problem.steps
    return problem.flow(velocity), steps
