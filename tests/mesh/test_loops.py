import time

import numpy as np
import pytest
from mesh_checks import SHAPES, triangle_areas

from ductsolve.errors import SectionError
from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.loops import centroid, edge_areas, edge_lengths, enclosed_area, outline_loops
from ductsolve.mesh.outline import polygon
from ductsolve.mesh.triangles import Boundary, edge_points, mesh_from_corners


def square(x, y, side=1.0):
    return [(x, y), (x + side, y), (x + side, y + side), (x, y + side)]


def assert_loops(mesh, loops):
    """Every edge once, head to tail and closed, the outer loop to the left and the holes to the right."""
    assert sorted(np.concatenate(loops).tolist()) == list(range(len(mesh.edges)))
    for loop in loops:
        assert (mesh.edges[loop, 1] == np.roll(mesh.edges[loop, 0], -1)).all()
    assert enclosed_area(mesh, loops[0]) > 0
    assert all(enclosed_area(mesh, loop) < 0 for loop in loops[1:])


@pytest.mark.parametrize("name", SHAPES)
def test_parts_cut_by_symmetry_lines_have_one_loop_around_their_area(name):
    mesh = SHAPES[name]().mesh()
    loops = outline_loops(mesh)
    assert len(loops) == 1
    assert_loops(mesh, loops)
    assert enclosed_area(mesh, loops[0]) == pytest.approx(triangle_areas(mesh).sum(), rel=1e-12)


def test_holes_come_from_left_to_right_at_every_refinement():
    mesh = polygon(square(0, 0, 10), [square(6, 2), square(1, 7), square(1, 1), square(4, 4, 2)]).mesh()
    rng = np.random.default_rng(1)
    for _ in range(4):
        loops = outline_loops(mesh)
        assert_loops(mesh, loops)
        lowest = [mesh.points[mesh.edges[loop, 0]].min(axis=0).tolist() for loop in loops]
        assert lowest == [[0, 0], [1, 1], [1, 7], [4, 4], [6, 2]]
        mesh = bisect(mesh, rng.random(len(mesh.triangles)) < 0.4).mesh


def test_parts_pinched_to_a_point_are_refused():
    points = [(0, 0), (1, 0), (0, 1), (-1, 0), (0, -1)]
    mesh = mesh_from_corners(points, [(0, 1, 2), (0, 3, 4)], [Boundary("wall")], lambda e: np.zeros(len(e)))
    with pytest.raises(SectionError, match=r"only in a corner at \(0, 0\) m"):
        outline_loops(mesh)


def test_long_outlines_are_quick():
    count = 40_000
    angle = 2 * np.pi * np.arange(count) / count
    ring = np.column_stack([np.cos(angle), np.sin(angle)])
    k = np.arange(count)
    after = (k + 1) % count
    corners = np.vstack(
        [np.column_stack([k, after, k + count]), np.column_stack([after, after + count, k + count])]
    )
    mesh = mesh_from_corners(
        np.vstack([2 * ring, ring]), corners, [Boundary("wall")], lambda e: np.zeros(len(e))
    )
    start = time.perf_counter()
    loops = outline_loops(mesh)
    assert time.perf_counter() - start < 2  # takes 0.1 s
    assert [len(loop) for loop in loops] == [count, count]
    assert_loops(mesh, loops)


def test_lengths_and_areas_of_parabolas_against_fine_polylines():
    rng = np.random.default_rng(2)
    nodes = rng.normal(size=(5, 3, 2))
    nodes[:, 2] = nodes[:, :2].mean(axis=1) + 0.2 * rng.uniform(-1, 1, (5, 2))
    at = np.stack([edge_points(nodes, s) for s in np.linspace(0, 1, 20_001)])
    steps = np.diff(at, axis=0)
    assert edge_lengths(nodes) == pytest.approx(np.linalg.norm(steps, axis=2).sum(axis=0), rel=1e-8)
    swept = (at[:-1, :, 0] * at[1:, :, 1] - at[:-1, :, 1] * at[1:, :, 0]).sum(axis=0) / 2
    assert edge_areas(nodes) == pytest.approx(swept, abs=1e-8)


def test_straight_edges_have_the_length_of_their_chord():
    ends = np.random.default_rng(3).normal(size=(9, 2, 2))
    nodes = np.concatenate([ends, ends.mean(axis=1, keepdims=True)], axis=1)
    assert edge_lengths(nodes) == pytest.approx(np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1), rel=1e-15)


def test_centroid_of_a_triangle():
    assert centroid(polygon([(0, 0), (3, 0), (0, 3)]).mesh()) == pytest.approx((1, 1), rel=1e-14)
