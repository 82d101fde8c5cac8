"""Sparse symmetric systems on six-node triangles: pattern once a level, values every step."""

from __future__ import annotations

import numpy as np
from scipy import sparse
from scipy.sparse.linalg import splu

# Without these together SuperLU treats the matrix as unsymmetric and is many times slower; wide panels do not
# pay on matrices this sparse.
SYMMETRIC = {"diag_pivot_thresh": 0.0, "panel_size": 1, "options": {"SymmetricMode": True}}


class SingularError(ArithmeticError):
    """A system lost its rank to rounding; whoever iterates keeps what it has."""


class System:
    """Unknowns of one field on one mesh.

    Parameters
    ----------
    unknown : (n_triangles, 6) number of the unknown behind each local node, -1 where it is given
    borders : (n_triangles, 6, n_borders) local values of extra unknowns that reach over many triangles
    """

    def __init__(self, unknown: np.ndarray, borders: np.ndarray | None = None):
        self.unknown = unknown
        self.size = int(unknown.max(initial=-1)) + 1
        self.borders = borders
        rows = np.repeat(unknown, 6, axis=1).ravel()
        columns = np.tile(unknown, (1, 6)).ravel()
        self._kept = np.flatnonzero((rows >= 0) & (columns >= 0))
        key = rows[self._kept] * self.size + columns[self._kept]
        order = np.argsort(key)
        self._order = self._kept[order]
        key = key[order]
        fresh = np.concatenate([[True], key[1:] != key[:-1]]) if len(key) else np.zeros(0, bool)
        self._starts = np.flatnonzero(fresh)
        self._indices = (key[fresh] % self.size).astype(np.int32)
        counts = np.bincount(key[fresh] // self.size, minlength=self.size)
        self._pointers = np.concatenate([[0], np.cumsum(counts)]).astype(np.int32)
        self._ordering = None
        self._slot = np.where(unknown >= 0, unknown, self.size).ravel()

    def gather(self, local: np.ndarray) -> np.ndarray:
        """Sum local values (n_triangles, 6) into the unknowns (size,)."""
        return np.bincount(self._slot, weights=local.ravel(), minlength=self.size + 1)[: self.size]

    def spread(self, solution: np.ndarray) -> np.ndarray:
        """Local values (n_triangles, 6) of a solution (size [+ n_borders],), 0 where given."""
        nodal = np.append(solution[: self.size], 0.0)
        local = nodal[self._slot].reshape(self.unknown.shape)
        if self.borders is not None:
            local = local + self.borders @ solution[self.size :]
        return local

    def factor(self, stiffness: np.ndarray):
        """Factorise local matrices (n_triangles, 36); returns a function from local loads to a solution."""
        values = np.add.reduceat(stiffness.ravel()[self._order], self._starts)
        try:
            solve = self._first_factor(values) if self._ordering is None else self._next_factor(values)
        except RuntimeError as error:
            raise SingularError(str(error)) from error
        if self.borders is None:
            return lambda load: solve(self.gather(load))
        return self._bordered(stiffness.reshape(-1, 6, 6), solve)

    def _first_factor(self, values):
        """Factorise with a fill-reducing ordering, and keep that for all later matrices of the pattern."""
        factors = splu(self._matrix(values), permc_spec="MMD_AT_PLUS_A", **SYMMETRIC)
        order = np.argsort(factors.perm_c)
        numbered = self._matrix(np.arange(1.0, len(values) + 1))[order][:, order]
        numbered.sort_indices()
        self._ordering = order, numbered.data.astype(int) - 1, numbered.indices, numbered.indptr
        return factors.solve

    def _next_factor(self, values):
        order, entries, indices, pointers = self._ordering
        matrix = sparse.csc_matrix((values[entries], indices, pointers), shape=(self.size, self.size))
        factors = splu(matrix, permc_spec="NATURAL", **SYMMETRIC)

        def solve(load):
            solution = np.empty_like(load)
            solution[order] = factors.solve(load[order])
            return solution

        return solve

    def _matrix(self, values):
        return sparse.csc_matrix((values, self._indices, self._pointers), shape=(self.size, self.size))

    def _bordered(self, stiffness, solve):
        """Eliminate the sparse unknowns, then the few borders."""
        reach = np.einsum("tij,tjh->tih", stiffness, self.borders)
        coupling = np.column_stack([self.gather(reach[..., h]) for h in range(reach.shape[2])])
        inner = solve(coupling)
        schur = np.einsum("tih,tik->hk", self.borders, reach) - coupling.T @ inner

        def answer(load):
            free = solve(self.gather(load))
            border_load = np.einsum("tih,ti->h", self.borders, load)
            jumps = np.linalg.solve(schur, border_load - coupling.T @ free)
            return np.concatenate([free - inner @ jumps, jumps])

        return answer
