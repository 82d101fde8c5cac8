"""Loops that numba can compile, doing what ductsolve's three most used array expressions do.

Straight triangles; nothing here is used by ductsolve. Run as a script it prints how long a fresh process
takes to import numba and to make the first call, compiled or from numba's cache.
"""

from __future__ import annotations

import math
import time

import numpy as np


def stiffness(b0, b1, c0, c1, weights, xx, xy, yy, slopes):
    """Integral (n_triangles, 36) of gradient . tensor gradient; ``slopes`` (6, 2 n_points)."""
    count, points = weights.shape
    out = np.zeros((count, 36))
    for t in range(count):
        for q in range(points):
            b, c, w = (b0[t, q], b1[t, q]), (c0[t, q], c1[t, q]), weights[t, q]
            p0, p1 = xx[t, q] * b[0] + xy[t, q] * b[1], xy[t, q] * b[0] + yy[t, q] * b[1]
            q0, q1 = xx[t, q] * c[0] + xy[t, q] * c[1], xy[t, q] * c[0] + yy[t, q] * c[1]
            bb, bc = w * (p0 * b[0] + p1 * b[1]), w * (p0 * c[0] + p1 * c[1])
            cc = w * (q0 * c[0] + q1 * c[1])
            for i in range(6):
                si, ri = slopes[i, q], slopes[i, points + q]
                along, across = bb * si + bc * ri, bc * si + cc * ri
                for j in range(i + 1):
                    out[t, 6 * i + j] += along * slopes[j, q] + across * slopes[j, points + q]
        for i in range(6):
            for j in range(i):
                out[t, 6 * j + i] = out[t, 6 * i + j]
    return out


def gradient(b0, b1, c0, c1, local, slopes):
    """Gradient (2, n_triangles, n_points) of local nodal values (n_triangles, 6)."""
    count, points = b0.shape
    out = np.empty((2, count, points))
    for t in range(count):
        for q in range(points):
            along, across = 0.0, 0.0
            for i in range(6):
                along += local[t, i] * slopes[i, q]
                across += local[t, i] * slopes[i, points + q]
            out[0, t, q] = along * b0[t, q] + across * c0[t, q]
            out[1, t, q] = along * b1[t, q] + across * c1[t, q]
    return out


def energy(stress, moved, step, weights, yield_stress, consistency, index):
    """Complementary energy of a Herschel-Bulkley fluid at stress + step x moved, both (2, n, m)."""
    total = 0.0
    for t in range(weights.shape[0]):
        for q in range(weights.shape[1]):
            x = stress[0, t, q] + step * moved[0, t, q]
            y = stress[1, t, q] + step * moved[1, t, q]
            excess = math.sqrt(x * x + y * y) - yield_stress
            if excess > 0:
                total += weights[t, q] * excess * (excess / consistency) ** (1 / index)
    return total * index / (index + 1)


def examples(count: int = 1, seed: int = 0):
    """Arguments for the three kernels, in order."""
    random = np.random.default_rng(seed)
    fields = random.uniform(1.0, 2.0, (8, count, 6))
    slopes, local = random.uniform(-1.0, 1.0, (6, 12)), random.uniform(-1.0, 1.0, (count, 6))
    stress = random.uniform(1.0, 2.0, (2, 2, count, 6))
    return [
        (*fields, slopes),
        (*fields[:4], local, slopes),
        (stress[0], stress[1], 0.5, fields[0], 1.0, 0.5, 0.6),
    ]


def main():
    start = time.perf_counter()
    from numba import njit  # here, because its import is what is timed

    imported = time.perf_counter()
    for kernel, arguments in zip((stiffness, gradient, energy), examples(), strict=True):
        njit(cache=True)(kernel)(*arguments)
    print(imported - start, time.perf_counter() - imported)


if __name__ == "__main__":
    main()
