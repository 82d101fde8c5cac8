import numpy as np
import pytest
from mesh_checks import CURVED, SHAPES, assert_conforming, smallest_angle, triangle_areas

from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.conformity import check_mesh
from ductsolve.mesh.sections import circle, rectangle


def refined(mesh, times, part=0.3, seed=0):
    """The refinements of a mesh bisected at random, again and again."""
    rng = np.random.default_rng(seed)
    for _ in range(times):
        step = bisect(mesh, rng.random(len(mesh.triangles)) < part)
        yield mesh, step
        mesh = step.mesh


@pytest.mark.parametrize("name", SHAPES)
def test_random_refinement_keeps_the_mesh_conforming_and_its_area(name):
    section = SHAPES[name]()
    for _, step in refined(section.mesh(), 4):
        mesh = step.mesh
        assert_conforming(mesh)
        check_mesh(mesh)
        assert len(section.copies) * triangle_areas(mesh).sum() == pytest.approx(section.area, rel=1e-12)


@pytest.mark.parametrize("name", CURVED)
def test_new_wall_corners_lie_on_the_true_wall(name):
    *_, (_, step) = refined(SHAPES[name]().mesh(), 4)
    for index, boundary in enumerate(step.mesh.boundaries):
        if boundary.curve:
            ends = step.mesh.points[step.mesh.edges[step.mesh.edge_boundary == index, :2]].reshape(-1, 2)
            assert boundary.curve.distance(ends).max() < 1e-14 * np.ptp(ends, axis=0).max()


def test_outline_edges_keep_their_boundaries():
    for old, step in refined(SHAPES["eccentric annulus"]().mesh(), 3):
        for index, boundary in enumerate(old.boundaries):
            if boundary.symmetry:
                length = [
                    np.ptp(m.points[m.edges[m.edge_boundary == index]][..., 1]) for m in (old, step.mesh)
                ]
                assert length[0] == pytest.approx(length[1], rel=1e-14)
                assert (step.mesh.points[step.mesh.edges[step.mesh.edge_boundary == index], 0] == 0).all()


def test_edge_owner_is_the_triangle_with_that_side():
    *_, (_, step) = refined(SHAPES["ellipse"]().mesh(), 3)
    owners = step.mesh.triangles[step.mesh.edge_owner]
    assert (owners[:, 3:] == step.mesh.edges[:, 2:]).any(axis=1).all()


def test_marked_triangles_fall_into_four_and_others_at_most():
    rng = np.random.default_rng(3)
    mesh = rectangle(2, 1).mesh()
    marked = rng.random(len(mesh.triangles)) < 0.2
    step = bisect(mesh, marked)
    children = np.bincount(step.parent, minlength=len(mesh.triangles))
    assert (children[marked] == 4).all()
    assert set(children) <= {1, 2, 3, 4}
    assert np.bincount(step.parent, weights=triangle_areas(step.mesh)) == pytest.approx(
        triangle_areas(mesh), rel=1e-13
    )


def test_nothing_marked_changes_nothing():
    mesh = circle(1).mesh()
    step = bisect(mesh, np.zeros(len(mesh.triangles), dtype=bool))
    assert (step.mesh.points == mesh.points).all()
    assert (step.mesh.triangles == mesh.triangles).all()
    assert (step.mesh.edges == mesh.edges).all()
    assert (step.prolongation.toarray() == np.eye(len(mesh.points))).all()


def test_prolongation_reproduces_quadratics_on_straight_meshes():
    def field(points):
        x, y = points.T
        return 1 + 2 * x - 3 * y + x * x - 4 * x * y + 5 * y * y

    for old, step in refined(rectangle(1, 3).mesh(), 5):
        assert step.prolongation @ field(old.points) == pytest.approx(field(step.mesh.points), rel=1e-13)


@pytest.mark.parametrize("name", ["square", "circle", "nearly touching annulus"])
def test_local_interpolation_is_the_prolongation_for_continuous_fields(name):
    rng = np.random.default_rng(4)
    for old, step in refined(SHAPES[name]().mesh(), 3):
        values = rng.normal(size=len(old.points))
        from_parent = np.einsum("nij,nj->ni", step.local, values[old.triangles[step.parent]])
        assert from_parent == pytest.approx((step.prolongation @ values)[step.mesh.triangles], abs=1e-13)
        assert step.prolongation @ np.ones(len(old.points)) == pytest.approx(np.ones(len(step.mesh.points)))


@pytest.mark.parametrize("name", ["square", "slot", "annulus", "eccentric annulus"])
def test_angles_do_not_wither_under_local_refinement(name):
    mesh = SHAPES[name]().mesh()
    first = smallest_angle(mesh)
    target = mesh.points[mesh.wall_edges[0, 0]]
    for _ in range(12):
        centres = mesh.points[mesh.triangles[:, :3]].mean(axis=1)
        near = np.linalg.norm(centres - target, axis=1)
        mesh = bisect(mesh, near <= np.sort(near)[2]).mesh
    assert len(mesh.triangles) < 2000
    # Bisection makes at most four shapes of each straight triangle, none with less than half its angles.
    assert smallest_angle(mesh) > 0.45 * first


def test_longest_sides_are_bisected_first():
    mesh = rectangle(3, 1).mesh()
    corners = mesh.points[mesh.triangles[:, :3]]
    length = np.linalg.norm(corners - np.roll(corners, -1, axis=1), axis=2)
    assert (length[:, 0] >= length.max(axis=1) * (1 - 1e-9)).all()


def test_meshes_cannot_be_changed():
    step = bisect(circle(1).mesh(), np.ones(7, dtype=bool))
    for array in (step.mesh.points, step.mesh.triangles, step.mesh.edges, step.mesh.edge_boundary):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0
