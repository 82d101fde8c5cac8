import math

import meshio
import numpy as np
import pytest
from mesh_checks import SHAPES, assert_conforming, triangle_areas
from mesh_writing import FORMATS, FOUR, SQUARE, read_quietly, write

from ductsolve.errors import SectionError
from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.files import read_section


@pytest.mark.parametrize("name", FORMATS)
@pytest.mark.parametrize("kind", ["triangle", "triangle6"])
def test_every_format_gives_back_the_mesh(tmp_path, capfd, name, kind):
    original = SHAPES["eccentric annulus"]().mesh()
    file, writer = FORMATS[name]
    cells = original.triangles if kind == "triangle6" else original.triangles[:, :3]
    points = np.column_stack([original.points, np.full(len(original.points), 0.7)])
    writer(tmp_path / file, meshio.Mesh(points, [(kind, cells)]))
    section = read_quietly(tmp_path / file, capfd)
    mesh = section.mesh()
    assert_conforming(mesh)
    exact = triangle_areas(original).sum()
    if kind == "triangle":
        straight = original.points[original.edges[:, :2]].reshape(-1, 4)
        x, y, u, v = (straight - np.tile(original.points[0], 2)).T
        exact = (x * v - y * u).sum() / 2
    assert section.area == pytest.approx(exact, rel=1e-12)
    assert triangle_areas(mesh).sum() == pytest.approx(section.area, rel=1e-13)
    assert len(mesh.triangles) == len(original.triangles)
    assert section.name == f"section from {file}"
    assert section.dimensions == {}
    assert [boundary.name for boundary in mesh.boundaries] == ["outer wall"]
    assert section.copies.shape == (1, 2, 3)


def test_parabolic_outline_is_the_true_wall(tmp_path, capfd):
    """A square whose sides bulge by h: area 1 + 4 (2/3) h, side length of a parabola in closed form."""
    h = 0.2
    crooked = [(0.2, 0.3), (0.7, 0.2), (0.8, 0.7), (0.3, 0.8)]  # inside, and therefore straightened
    points = [*SQUARE, (0.5, -h), (1 + h, 0.5), (0.5, 1 + h), (-h, 0.5), *crooked]
    cells = [(0, 1, 4, 5, 10, 9), (1, 2, 4, 6, 11, 10), (2, 3, 4, 7, 12, 11), (3, 0, 4, 8, 9, 12)]
    section = read_quietly(write(tmp_path / "b.vtu", points, [("triangle6", cells)]), capfd)
    assert section.area == pytest.approx(1 + 4 * 2 / 3 * h, rel=1e-14)
    root = math.sqrt(1 + 16 * h * h)
    assert section.perimeter == pytest.approx(4 * (root / 2 + math.asinh(4 * h) / (8 * h)), rel=1e-13)
    mesh = section.mesh()
    assert_conforming(mesh)
    assert all(boundary.curve is None for boundary in mesh.boundaries)
    assert (mesh.edge_deviation == 0).all()
    finer = bisect(mesh, np.ones(4, dtype=bool)).mesh
    assert triangle_areas(finer).sum() == pytest.approx(section.area, rel=1e-14)


@pytest.mark.parametrize("kind", ["quad", "quad8", "quad9"])
def test_quads_are_cut_in_two(tmp_path, capfd, kind):
    points = [(0, 0), (2, 0), (2, 1), (0, 1), (1, -0.1), (2, 0.5), (1, 1), (0, 0.5), (1, 0.5)]
    count = {"quad": 4, "quad8": 8, "quad9": 9}[kind]
    section = read_quietly(write(tmp_path / "q.vtu", points[:count], [(kind, [range(count)])]), capfd)
    assert len(section.mesh().triangles) == 2
    assert section.area == pytest.approx(2 if kind == "quad" else 2 + 2 / 3 * 0.1 * 2, rel=1e-14)


def test_hollow_quads_are_cut_where_both_halves_have_area(tmp_path, capfd):
    points = np.array([(0, 0), (1, 0), (0.2, 0.2), (0, 1)])
    for turn in range(4):
        for way in (1, -1):
            cell = np.roll(np.arange(4), turn)[::way]
            section = read_quietly(write(tmp_path / "q.vtu", points, [("quad", [cell])]), capfd)
            assert section.area == pytest.approx(0.2, rel=1e-14)


def test_mixed_cells_orientations_and_unused_points(tmp_path, capfd):
    points = [(9, 9), (0, 0), (1, 0), (1, 1), (0, 1), (2, 0), (2, 1), (np.nan, 0)]
    cells = [("triangle", [(1, 2, 3), (1, 4, 3)]), ("vertex", [[0]]), ("quad", [(2, 3, 6, 5)])]
    section = read_quietly(write(tmp_path / "m.msh", points, cells), capfd)
    assert section.area == pytest.approx(2, rel=1e-14)
    assert section.perimeter == pytest.approx(6, rel=1e-14)
    assert len(section.mesh().triangles) == 4
    assert_conforming(section.mesh())


def test_unit_scales_lengths(tmp_path, capfd):
    section = read_quietly(write(tmp_path / "mm.vtu", SQUARE, [("triangle", FOUR)]), capfd, unit=1e-3)
    assert section.area == pytest.approx(1e-6, rel=1e-14)
    assert section.perimeter == pytest.approx(4e-3, rel=1e-14)
    assert section.origin == pytest.approx((5e-4, 5e-4), rel=1e-14)


@pytest.mark.parametrize("unit", [0, -1, math.nan, math.inf, "mm", None, True])
def test_impossible_units_are_refused(tmp_path, unit):
    path = write(tmp_path / "s.vtu", SQUARE, [("triangle", FOUR)])
    with pytest.raises(SectionError, match="unit must be a positive number of metres"):
        read_section(path, unit)


def test_single_precision_and_whole_number_coordinates(tmp_path, capfd):
    for dtype in (np.float32, np.int64):
        points = np.array([(0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0)], dtype=dtype)
        meshio.Mesh(points, [("triangle", np.array([(0, 1, 2), (0, 2, 3)]))]).write(tmp_path / "s.vtu")
        assert read_quietly(tmp_path / "s.vtu", capfd).area == 1


def test_flat_points_of_two_coordinates(tmp_path, capfd):
    points = np.array(SQUARE, dtype=float)
    meshio.xdmf.write(tmp_path / "s.xdmf", meshio.Mesh(points, [("triangle", np.array(FOUR))]))
    assert read_quietly(tmp_path / "s.xdmf", capfd).area == 1
