"""Walking along the walls."""

import numpy as np
import pytest

import ductsolve
from ductsolve.post.along_wall import distance_along, wall_loops


def wall_of(section):
    return ductsolve.solve(section, ductsolve.PowerLaw(1.0, 0.6), pressure_gradient=1e3).wall_shear


def test_each_loop_is_walked_once():
    wall = wall_of(ductsolve.annulus(0.1, 0.06, 0.3))
    outer, inner = wall_loops(wall)
    assert sorted([*outer.rows, *inner.rows]) == list(range(len(wall.stress)))
    for loop, diameter in ((outer, 0.1), (inner, 0.06)):
        assert (np.diff(loop.distance) > 0).all()
        total = loop.distance[-1] + wall.length[loop.rows[-1]] / 2
        assert total == pytest.approx(np.pi * diameter, rel=1e-4)
        steps = np.linalg.norm(np.diff(wall.position[loop.rows], axis=0), axis=1)
        assert steps.max() < 2.1 * wall.length.max()


def test_a_walk_starts_where_a_wall_begins():
    wall = wall_of(ductsolve.rectangle(0.2, 0.1))
    (loop,) = wall_loops(wall)
    assert len(loop.stretches) == 4
    assert loop.stretches[0][0] == 0 and loop.stretches[-1][1] == len(loop.rows)
    lengths = [wall.length[loop.rows[first:last]].sum() for first, last, _ in loop.stretches]
    assert lengths == pytest.approx([0.1, 0.2, 0.1, 0.2], rel=1e-9)
    for first, last, name in loop.stretches:
        assert {wall.names[k] for k in wall.wall[loop.rows[first:last]]} == {name}


def test_distance_belongs_to_the_piece():
    wall = wall_of(ductsolve.rectangle(0.2, 0.1))
    distance = distance_along(wall)
    (loop,) = wall_loops(wall)
    assert distance[loop.rows] == pytest.approx(loop.distance)
    assert distance.min() == pytest.approx(wall.length[loop.rows[0]] / 2)
