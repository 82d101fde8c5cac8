"""Wall shear stress along each wall, as a curve over the distance walked."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ductsolve.solver.wall import WallShear


@dataclass(frozen=True, eq=False)
class WallLoop:
    """One closed outline of the section, walked with the fluid on the left.

    Attributes
    ----------
    number : 0 the outer outline, 1 and up the holes
    rows : (n,) its pieces among those of the ``WallShear``, in walking order
    distance : (n,) walked to the middle of each piece [m]
    stretches : (first, last + 1, name) of each run of pieces with one wall name
    """

    number: int
    rows: np.ndarray
    distance: np.ndarray
    stretches: tuple[tuple[int, int, str], ...]


def wall_loops(wall: WallShear) -> list[WallLoop]:
    """The loops of a wall shear map, each starting where a wall begins."""
    return [_loop(wall, number) for number in range(int(wall.loop.max()) + 1)]


def distance_along(wall: WallShear) -> np.ndarray:
    """Distance (n,) along its loop of every piece of a wall shear map [m]."""
    distance = np.empty(len(wall.stress))
    for loop in wall_loops(wall):
        distance[loop.rows] = loop.distance
    return distance


def _loop(wall, number):
    rows = np.flatnonzero(wall.loop == number)
    rows = np.roll(rows, -_start(wall, rows))
    length, names = wall.length[rows], wall.wall[rows]
    begins = np.flatnonzero(np.diff(names, prepend=-1))
    ends = [*begins[1:], len(rows)]
    stretches = [(int(i), int(j), wall.names[names[i]]) for i, j in zip(begins, ends, strict=True)]
    return WallLoop(number, rows, np.cumsum(length) - length / 2, tuple(stretches))


def _start(wall, rows):
    """Where to start walking: at the leftmost beginning of a wall, or the leftmost piece."""
    changes = np.flatnonzero(wall.wall[rows] != np.roll(wall.wall[rows], 1))
    places = changes if len(changes) else np.arange(len(rows))
    x, y = wall.position[rows[places]].T
    return int(places[np.lexsort((y, np.round(x / (np.ptp(wall.position[:, 0]) or 1.0), 9)))[0]])
