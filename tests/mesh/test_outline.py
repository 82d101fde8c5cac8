import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mesh_checks import assert_conforming, smallest_angle, triangle_areas

from ductsolve.errors import SectionError
from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.loops import outline_loops
from ductsolve.mesh.outline import polygon

L_PROFILE = [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)]


def ring(count, radius=1.0, centre=(0.0, 0.0), turn=0.0):
    angle = turn + 2 * np.pi * np.arange(count) / count
    return np.column_stack([np.cos(angle), np.sin(angle)]) * radius + centre


def shoelace(points):
    (x, y), (u, v) = np.array(points, dtype=float).T, np.roll(np.array(points, dtype=float), -1, axis=0).T
    return abs((x * v - y * u).sum()) / 2


def length(points):
    points = np.array(points, dtype=float)
    return np.linalg.norm(points - np.roll(points, -1, axis=0), axis=1).sum()


def assert_covers(section, points, holes=()):
    """The mesh is conforming, holds the exact area and has the given corners on its outline."""
    mesh = section.mesh()
    assert_conforming(mesh)
    area = shoelace(points) - sum(map(shoelace, holes))
    assert section.area == pytest.approx(area, rel=1e-10)
    assert triangle_areas(mesh).sum() == pytest.approx(area, rel=1e-10)
    assert section.perimeter == pytest.approx(length(points) + sum(map(length, holes)), rel=1e-12)
    given_corners = np.vstack([points, *holes]).astype(float)
    assert set(map(tuple, mesh.points[mesh.edges[:, 0]])) >= set(map(tuple, given_corners))
    assert len(outline_loops(mesh)) == 1 + len(holes)


@pytest.mark.parametrize("way", [1, -1])
@pytest.mark.parametrize("first", range(6))
def test_l_profile(first, way):
    points = np.roll(L_PROFILE, first, axis=0)[::way]
    section = polygon(points)
    assert_covers(section, points)
    assert section.area == pytest.approx(3, rel=1e-15)
    assert section.name == "polygon of 6 sides"
    assert section.dimensions == {}
    assert [b.name for b in section.mesh().boundaries] == ["outer wall"]
    assert not section.mesh().symmetry_edges.any()


def test_repeating_the_first_corner_closes_the_outline():
    assert_covers(polygon([*L_PROFILE, L_PROFILE[0]]), L_PROFILE)


def test_corners_on_straight_sides_are_kept():
    turn = np.array([[math.cos(0.4), -math.sin(0.4)], [math.sin(0.4), math.cos(0.4)]])
    at = np.arange(7)
    sides = [(at, 0 * at), (0 * at + 7, at), (7 - at, 0 * at + 7), (0 * at, 7 - at)]
    points = np.vstack([np.column_stack(side) for side in sides]) @ turn.T / 7
    assert_covers(polygon(points), points)


def test_holes_keep_their_order_and_names():
    holes = [ring(8, 0.5, (6, 6)), ring(5, 0.7, (2, 3))[::-1], ring(4, 0.2, (8, 1)), ring(3, 0.4, (2, 8))]
    points = [(0, 0), (10, 0), (10, 10), (0, 10)]
    section = polygon(points, holes)
    assert_covers(section, points, holes)
    mesh = section.mesh()
    assert [b.name for b in mesh.boundaries] == ["outer wall"] + [f"hole {k} wall" for k in (1, 2, 3, 4)]
    for k, hole in enumerate(holes, start=1):
        assert set(map(tuple, mesh.points[mesh.edges[mesh.edge_boundary == k, 0]])) == set(map(tuple, hole))
    assert section.name == "polygon of 4 sides with 4 holes"


def test_holes_in_rows_and_columns_are_all_reached():
    """Bridges from hole to hole run through corners in line with each other."""
    at = np.arange(5.0)
    holes = [
        [(x + 0.25, y + 0.25), (x + 0.75, y + 0.25), (x + 0.75, y + 0.75), (x + 0.25, y + 0.75)]
        for x in at
        for y in at
    ]
    points = [(0, 0), (5, 0), (5, 5), (0, 5)]
    assert_covers(polygon(points, holes), points, holes)


def test_spiral_and_comb():
    angle = np.linspace(0, 6 * np.pi, 120)
    arm = np.column_stack([np.cos(angle), np.sin(angle)])
    spiral = np.vstack([(1 + angle[:, None]) * arm, ((1.3 + angle[:, None]) * arm)[::-1]])
    assert_covers(polygon(spiral), spiral)
    comb = [(0, 0), (40, 0), *((40 - k, 1 + 9 * (k % 2)) for k in range(41))]
    assert_covers(polygon(comb), comb)


def test_many_sides_have_no_slivers_across():
    section = polygon(ring(200))
    assert_covers(section, ring(200))
    # Without inner points the triangles of corners on a circle have angles of 180/200 degrees.
    assert smallest_angle(section.mesh()) > math.radians(8)
    assert len(section.mesh().triangles) < 1000


def test_long_sides_are_split_where_they_face_short_ones():
    comb = [(0, 0), (40, 0), *((40 - k, 3 + k % 2) for k in range(41))]
    mesh = polygon(comb).mesh()
    base = mesh.edges[(mesh.points[mesh.edges[:, :2]][..., 1] == 0).all(axis=1)]
    assert 6 <= len(base) <= 40
    assert smallest_angle(mesh) > math.radians(7)


def test_few_sides_have_no_inner_points():
    assert len(polygon(L_PROFILE).mesh().triangles) == 4
    assert len(polygon([(0, 0), (1000, 0), (1000, 1), (0, 1)]).mesh().triangles) == 2


@pytest.mark.parametrize(
    ("points", "holes"),
    [
        (ring(30), [ring(7, 0.3, (0.3, 0.1))]),
        ([(0, 0), (9, 0), (9, 1), (5, 2), (9, 3), (9, 4), (0, 4), (2, 3)], []),
        ([(x, (x - 5) ** 2 / 20) for x in range(11)] + [(5, 4)], []),
    ],
)
def test_inner_sides_are_delaunay(points, holes):
    mesh = polygon(points, holes).mesh()
    opposite = {}
    for a, b, c in mesh.triangles[:, :3].tolist():
        for p, q, r in ((a, b, c), (b, c, a), (c, a, b)):
            u, v = mesh.points[p] - mesh.points[r], mesh.points[q] - mesh.points[r]
            angle = math.atan2(u[0] * v[1] - u[1] * v[0], u @ v)
            opposite.setdefault(frozenset((p, q)), []).append(angle)
    inner = [sum(angles) for angles in opposite.values() if len(angles) == 2]
    assert max(inner) < math.pi + 1e-6


def test_refinement_keeps_area_and_walls():
    points, holes = ring(9), [ring(4, 0.2)]
    mesh = polygon(points, holes).mesh()
    area = triangle_areas(mesh).sum()
    rng = np.random.default_rng(1)
    for _ in range(5):
        mesh = bisect(mesh, rng.random(len(mesh.triangles)) < 0.3).mesh
        assert_conforming(mesh)
        assert triangle_areas(mesh).sum() == pytest.approx(area, rel=1e-13)
        nodes = mesh.points[mesh.edges[mesh.edge_boundary == 1, 0]]
        assert np.linalg.norm(nodes, axis=1).max() == pytest.approx(0.2, rel=1e-14)


@settings(max_examples=60, deadline=None)
@given(
    radii=st.lists(st.floats(0.05, 1), min_size=3, max_size=40),
    scale=st.floats(-6, 4).map(lambda x: 10**x),
    turn=st.floats(0, 7),
    hole=st.floats(0.1, 0.9),
)
def test_any_star(radii, scale, turn, hole):
    """Star-shaped outlines with a hole of the same shape, at any size and place."""
    angle = turn + 2 * np.pi * np.arange(len(radii)) / len(radii)
    rim = np.array(radii)[:, None] * np.column_stack([np.cos(angle), np.sin(angle)])
    points, inner = scale * (rim + 3), scale * (hole * rim + 3)
    assert_covers(polygon(points, [inner]), points, [inner])


# --- refusals ---------------------------------------------------------------------------------------

SQUARE = [(0, 0), (4, 0), (4, 4), (0, 4)]


def box(x, y, side=1.0):
    return [(x, y), (x + side, y), (x + side, y + side), (x, y + side)]


@pytest.mark.parametrize(
    ("points", "holes", "words"),
    [
        ([(0, 0), (2, 2), (2, 0), (0, 2)], (), r"the outline crosses itself at \(1, 1\) m"),
        ([(0, 0), (4, 0), (4, 4), (2, 0), (0, 4)], (), r"the outline touches itself at \(2, 0\) m"),
        ([(0, 0), (4, 0), (2, 0), (2, 3)], (), r"the outline touches itself at \(2, 0\) m"),
        ([(0, 0), (4, 0), (4, 4), (4, 0)], (), r"two corners of the outline lie at \(4, 0\) m"),
        ([(0, 0), (4, 0), (4 + 1e-11, 0), (0, 4)], (), r"two corners of the outline lie at \(4, 0\) m"),
        ([(0, 0), (1, 1), (3, 3)], (), r"the outline from \(.*\) m on has no area"),
        ([(0, 0), (1, 1)], (), "points must have at least three corners, found 2"),
        ([(0, 0), (1, 1), (0, 0)], (), "points must have at least three corners, found 2"),
        ([], (), "points must be a list of"),
        (
            [(0, 0, 0), (1, 0, 0), (1, 1, 0)],
            (),
            r"points must be a list of \(x, y\) in metres, .* shape \(3, 3\)",
        ),
        ([(0, 0), (1, 0), (1,)], (), r"points must be a list of \(x, y\) in metres"),
        ("square", (), r"points must be a list of \(x, y\) in metres"),
        (None, (), r"points must be a list of \(x, y\) in metres"),
        (
            [(0, 0), (1, 0), (math.nan, 1)],
            (),
            "points: corner 3 has a coordinate that is not a finite number",
        ),
        (SQUARE, [box(5, 5)], r"the hole with a corner at \(5, 6\) m lies outside the section"),
        (SQUARE, [box(-3, -3, 10)], r"the hole with a corner at .* lies outside the section"),
        (SQUARE, [box(3.5, 1)], r"the outline crosses itself at \(4, "),
        (SQUARE, [box(3, 1)], r"the outline touches itself at \(4, "),
        (SQUARE, [box(0, 0)], r"two corners of the outline lie at \(0, 0\) m"),
        (
            SQUARE,
            [box(1, 1, 2), box(1.5, 1.5)],
            r"the hole with a corner at \(1.5, .*\) m lies in another hole",
        ),
        (
            SQUARE,
            [box(1.5, 1.5), box(1, 1, 2)],
            r"the hole with a corner at \(1.5, .*\) m lies in another hole",
        ),
        (SQUARE, [box(1, 1), box(1.5, 1.5)], "the outline crosses itself at"),
        (SQUARE, [[(1, 1), (2, 2)]], "hole 1 must have at least three corners, found 2"),
        (SQUARE, [box(1, 1), [(2, 2), (3, math.inf), (3, 3)]], "hole 2: corner 2 has a coordinate"),
    ],
)
def test_outlines_that_enclose_no_section_are_refused_in_one_line(points, holes, words):
    with pytest.raises(SectionError, match=words) as caught:
        polygon(points, holes)
    assert "\n" not in str(caught.value)
