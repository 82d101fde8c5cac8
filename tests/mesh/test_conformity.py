import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ductsolve.errors import SectionError
from ductsolve.mesh.conformity import check_mesh, first_contact
from ductsolve.mesh.triangles import Boundary, mesh_from_corners


def contact(points, edges):
    return first_contact(np.array(points, dtype=float), np.array(edges))


def crosses(p, q, r, s):
    """Whether segments p-q and r-s cross, in whole numbers."""

    def turn(a, b, c):
        return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])

    return turn(p, q, r) * turn(p, q, s) < 0 and turn(r, s, p) * turn(r, s, q) < 0


def test_crossing_edges_are_found_where_they_cross():
    where, crossing = contact([(0, 0), (4, 4), (0, 2), (2, 0)], [(0, 1), (2, 3)])
    assert crossing
    assert where == pytest.approx((1, 1))


@pytest.mark.parametrize(
    ("points", "edges", "place"),
    [
        ([(0, 0), (4, 0), (1, 0), (1, 3)], [(0, 1), (2, 3)], (1, 0)),  # an end on the other edge
        ([(0, 0), (4, 0), (2, 0), (6, 0)], [(0, 1), (2, 3)], (4, 0)),  # along each other
        ([(0, 0), (4, 0), (2, 0)], [(0, 1), (0, 2)], (2, 0)),  # back along a neighbour
        ([(0, 0), (4, 0), (4, 0), (5, 5)], [(0, 1), (2, 3)], (4, 0)),  # end on end, not shared
    ],
)
def test_touching_edges_are_found_where_they_touch(points, edges, place):
    where, crossing = contact(points, edges)
    assert not crossing
    assert tuple(where) in {place, (2, 0)}


def test_edges_that_share_an_end_or_are_apart_do_not_touch():
    assert contact([(0, 0), (4, 0), (4, 4)], [(0, 1), (1, 2), (2, 0)]) is None
    assert contact([(0, 0), (4, 0), (5, 0), (9, 0)], [(0, 1), (2, 3)]) is None
    assert contact([(0, 0), (4, 4), (4, 0), (3, 1.9)], [(0, 1), (2, 3)]) is None


@settings(max_examples=200, deadline=None)
@given(st.lists(st.tuples(st.integers(0, 60), st.integers(0, 60)), min_size=4, max_size=24, unique=True))
def test_sweep_finds_what_comparing_all_pairs_finds(points):
    edges = [(k, k + 1) for k in range(0, len(points) - 1, 2)]
    pairs = [(e, f) for k, e in enumerate(edges) for f in edges[:k]]
    any_crossing = any(crosses(*(points[k] for k in (*e, *f))) for e, f in pairs)
    found = contact(points, edges)
    if any_crossing:
        assert found is not None
    if found is not None and found[1]:
        assert any_crossing


def test_many_edges_are_swept_in_a_moment():
    count = 40_000
    angle = 2 * np.pi * np.arange(count) / count
    ring = np.column_stack([np.cos(angle), np.sin(angle)]) * (1 + 0.2 * np.sin(9 * angle))[:, None]
    k = np.arange(count)
    assert contact(ring, np.column_stack([k, (k + 1) % count])) is None


def test_sections_covered_twice_are_refused():
    """Two turns round a point fit together triangle by triangle, and even close."""
    angle = 4 * np.pi * np.arange(12) / 12
    rim = np.column_stack([np.cos(angle), np.sin(angle)]) * (1 + 0.03 * np.arange(12))[:, None]
    corners = [(0, 1 + k, 1 + (k + 1) % 12) for k in range(12)]
    mesh = mesh_from_corners(
        np.vstack([[0, 0], rim]), corners, [Boundary("wall")], lambda e: np.zeros(len(e))
    )
    with pytest.raises(SectionError, match="the mesh overlaps itself"):
        check_mesh(mesh)


def test_two_sheets_joined_crosswise_are_refused():
    """No two outline edges touch and all triangles fit, but everything within the inner outline is covered
    twice: two sheets are cut between the same points and joined crosswise along the cut."""
    points = [(-1, 0), (1, 0), (0, 0.1), (0, -0.1)]
    left, right, above, below = range(4)
    corners = []
    for size, up, down in ((3, above, below), (6, below, above)):
        north, west, south, east = (len(points) + k for k in range(4))
        points += [(0, size), (-size, 0), (0, -size), (size, 0)]
        corners += [(left, up, north), (up, right, north), (left, south, down), (south, right, down)]
        corners += [(north, west, left), (west, south, left), (south, east, right), (east, north, right)]
    mesh = mesh_from_corners(points, corners, [Boundary("wall")], lambda e: np.zeros(len(e)))
    with pytest.raises(SectionError, match="the mesh overlaps itself around"):
        check_mesh(mesh)
