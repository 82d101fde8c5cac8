import math
import re
import sys
import warnings

import meshio
import numpy as np
import pytest
from mesh_checks import SHAPES, assert_conforming, triangle_areas

from ductsolve.errors import DuctsolveWarning, SectionError
from ductsolve.mesh.bisect import bisect
from ductsolve.mesh.files import read_section
from ductsolve.mesh.loops import outline_loops

# Unit square with its centre: corners 0-3 counter-clockwise from the origin, 4 in the middle.
SQUARE = [(0, 0), (1, 0), (1, 1), (0, 1), (0.5, 0.5)]
FOUR = [(0, 1, 4), (1, 2, 4), (2, 3, 4), (3, 0, 4)]
SIDES = [(0, 1), (1, 2), (2, 3), (3, 0)]


def write(path, points, cells, **data):
    """Write points in the x-y plane and blocks of cells, in the format of the path's ending."""
    points = np.asarray(points, dtype=float)
    if points.shape[1] == 2:
        points = np.column_stack([points, np.zeros(len(points))])
    cells = [(kind, np.array(block)) for kind, block in cells]
    mesh = meshio.Mesh(points, cells, **data)
    if path.suffix == ".msh":
        meshio.gmsh.write(path, mesh, fmt_version="2.2", binary=False)
    else:
        mesh.write(path)
    return path


def read_quietly(path, capfd, **options):
    capfd.readouterr()
    try:
        return read_section(path, **options)
    finally:
        assert capfd.readouterr() == ("", "")


def refusal(path, capfd):
    """The one line with which a file is refused."""
    with pytest.raises(SectionError) as caught:
        read_quietly(path, capfd)
    line = str(caught.value)
    assert "\n" not in line
    assert line.startswith(f"{path.name}: ")
    assert len(line) < 240
    return line


# --- formats ----------------------------------------------------------------------------------------

FORMATS = {
    "msh 2 ascii": ("a.msh", lambda p, m: meshio.gmsh.write(p, m, "2.2", binary=False)),
    "msh 2 binary": ("a.msh", lambda p, m: meshio.gmsh.write(p, m, "2.2", binary=True)),
    "msh 4.0 ascii": ("a.msh", lambda p, m: meshio.gmsh.write(p, m, "4.0", binary=False)),
    "msh 4.0 binary": ("a.msh", lambda p, m: meshio.gmsh.write(p, m, "4.0", binary=True)),
    "msh 4.1 ascii": ("a.msh", lambda p, m: meshio.gmsh.write(p, m, "4.1", binary=False)),
    "msh 4.1 binary": ("a.msh", lambda p, m: meshio.gmsh.write(p, m, "4.1", binary=True)),
    "vtu ascii": ("a.vtu", lambda p, m: meshio.vtu.write(p, m, binary=False)),
    "vtu raw": ("a.vtu", lambda p, m: meshio.vtu.write(p, m, compression=None)),
    "vtu packed": ("A.VTU", lambda p, m: meshio.vtu.write(p, m)),
    "vtk": ("a.vtk", lambda p, m: meshio.vtk.write(p, m)),
    "xdmf": ("a.xdmf", lambda p, m: meshio.xdmf.write(p, m)),
    "xdmf in one file": ("a.xmf", lambda p, m: meshio.xdmf.write(p, m, data_format="XML")),
}


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


# --- walls ------------------------------------------------------------------------------------------


def names_at(mesh, place):
    """Names of the boundaries of the outline edges with a middle for which ``place`` holds."""
    return {mesh.boundaries[k].name for k in mesh.edge_boundary[place(*mesh.points[mesh.edges[:, 2]].T)]}


def test_walls_without_names_are_named_by_their_loop(tmp_path, capfd):
    """A plate with two square holes, the left one first."""
    grid = np.arange(8)
    x, y = np.meshgrid(grid, np.arange(4), indexing="ij")
    number = np.arange(x.size).reshape(x.shape)
    cells = [
        (number[i, j], number[i + 1, j], number[i + 1, j + 1], number[i, j + 1])
        for i in range(7)
        for j in range(3)
        if (i, j) not in ((1, 1), (4, 1))
    ]
    points = np.column_stack([x.ravel(), y.ravel()])
    section = read_quietly(write(tmp_path / "holes.msh", points, [("quad", cells)]), capfd)
    mesh = section.mesh()
    assert section.area == pytest.approx(19, rel=1e-14)
    assert section.perimeter == pytest.approx(20 + 8, rel=1e-14)
    assert {b.name for b in mesh.boundaries} == {"outer wall", "hole 1 wall", "hole 2 wall"}
    assert names_at(mesh, lambda x, y: (x >= 1) & (x <= 2) & (y >= 1) & (y <= 2)) == {"hole 1 wall"}
    assert names_at(mesh, lambda x, y: (x >= 4) & (x <= 5) & (y >= 1) & (y <= 2)) == {"hole 2 wall"}
    assert len(outline_loops(mesh)) == 3


def test_physical_groups_of_msh_2(tmp_path, capfd):
    """Half of a ring, its straight sides in one group of symmetry lines; names of surfaces do not count."""
    mesh = SHAPES["eccentric annulus"]().mesh()
    tags = np.array([3 if b.symmetry else 5 if b.name == "inner wall" else 0 for b in mesh.boundaries])
    path = write(
        tmp_path / "half.msh",
        mesh.points,
        [("line3", mesh.edges), ("triangle6", mesh.triangles)],
        field_data={"Symmetry (midplane)": [3, 1], "inner pipe": [5, 1], "mud": [5, 2]},
        cell_data={
            "gmsh:physical": [tags[mesh.edge_boundary], np.full(len(mesh.triangles), 5)],
            "gmsh:geometrical": [np.ones(len(mesh.edges), int), np.ones(len(mesh.triangles), int)],
        },
    )
    section = read_quietly(path, capfd)
    read = section.mesh()
    whole = SHAPES["eccentric annulus"]()
    assert {(b.name, b.symmetry) for b in read.boundaries} == {
        ("Symmetry (midplane)", True),
        ("inner pipe", False),
        ("outer wall", False),
    }
    assert section.area == pytest.approx(whole.area / 2, rel=1e-12)
    assert section.perimeter == pytest.approx(whole.perimeter / 2, rel=1e-6)
    assert section.origin[0] == 0
    assert read.symmetry_edges.sum() == mesh.symmetry_edges.sum()
    assert names_at(read, lambda x, y: x == 0) == {"Symmetry (midplane)"}


MSH_4 = """$MeshFormat
4.1 0 8
$EndMeshFormat
$PhysicalNames
3
1 1 "warm side"
1 2 "cold side"
2 7 "inside"
$EndPhysicalNames
$Entities
0 2 1 0
1 0 0 0 1 0 0 1 1 0
2 0 0 0 1 1 0 {second} 0
1 0 0 0 1 1 0 1 7 2 1 2
$EndEntities
$Nodes
3 4 10 40
1 1 0 2
10
20
0 0 0
1 0 0
1 2 0 0
2 1 0 2
30
40
1 1 0
0 1 0
$EndNodes
$Elements
3 6 1 6
1 1 1 1
1 10 20
1 2 1 3
2 20 30
3 30 40
4 40 10
2 1 2 2
5 10 20 30
6 10 30 40
$EndElements
"""


def test_physical_groups_of_msh_4(tmp_path, capfd):
    path = tmp_path / "four.msh"
    path.write_text(MSH_4.format(second="1 2"))
    mesh = read_quietly(path, capfd).mesh()
    assert [b.name for b in mesh.boundaries] == ["cold side", "warm side"]
    assert names_at(mesh, lambda x, y: y == 0) == {"warm side"}
    assert names_at(mesh, lambda x, y: y > 0) == {"cold side"}


def test_msh_4_with_some_cells_in_no_group_says_what_to_do(tmp_path, capfd):
    path = tmp_path / "four.msh"
    path.write_text(MSH_4.format(second="0"))
    assert "put every curve and surface in one" in refusal(path, capfd)


@pytest.mark.parametrize("ending", ["vtu", "xdmf", "vtk"])
def test_integer_cell_arrays_name_walls(tmp_path, capfd, ending):
    path = write(
        tmp_path / f"tags.{ending}",
        SQUARE,
        [("line", SIDES), ("triangle", FOUR)],
        cell_data={"side": [np.array([1, 0, 2, 2]), np.zeros(4, int)], "heat": [np.ones(4), np.ones(4)]},
    )
    mesh = read_quietly(path, capfd).mesh()
    assert names_at(mesh, lambda x, y: y == 0) == {"side 1"}
    assert names_at(mesh, lambda x, y: x == 1) == {"outer wall"}
    assert names_at(mesh, lambda x, y: (x == 0) | (y == 1)) == {"side 2"}


def test_array_called_symmetry_makes_symmetry_lines(tmp_path, capfd):
    """Quarter of a 2 by 2 square."""
    path = write(
        tmp_path / "quarter.vtu",
        SQUARE,
        [("line", SIDES), ("triangle", FOUR)],
        cell_data={"symmetry": [np.array([1, 0, 0, 1]), np.zeros(4, int)]},
    )
    section = read_quietly(path, capfd)
    assert section.area == pytest.approx(1, rel=1e-14)
    assert section.perimeter == pytest.approx(2, rel=1e-14)
    assert section.hydraulic_diameter == pytest.approx(2, rel=1e-14)
    assert section.origin == pytest.approx((0, 0), abs=1e-15)
    assert [b.symmetry for b in section.mesh().boundaries] == [False, True]


def test_integer_point_arrays_name_walls_round_corners(tmp_path, capfd):
    """The corner belongs to one side only, but the edges at it go with the side they continue."""
    k = 4
    x, y = np.meshgrid(np.arange(k + 1), np.arange(k + 1), indexing="ij")
    n = np.arange(x.size).reshape(x.shape)
    quads = [(n[i, j], n[i + 1, j], n[i + 1, j + 1], n[i, j + 1]) for i in range(k) for j in range(k)]
    tag = np.where(y == 0, 1, np.where(x == 0, 2, 0)).ravel()
    path = write(
        tmp_path / "points.vtu",
        np.column_stack([x.ravel(), y.ravel()]),
        [("quad", quads)],
        point_data={"number": np.arange(1, x.size + 1), "symmetry": tag},
    )
    section = read_quietly(path, capfd)
    mesh = section.mesh()
    assert names_at(mesh, lambda x, y: y == 0) == {"symmetry 1"}
    assert names_at(mesh, lambda x, y: x == 0) == {"symmetry 2"}
    assert names_at(mesh, lambda x, y: (x == k) | (y == k)) == {"outer wall"}
    assert section.origin == pytest.approx((0, 0), abs=1e-14)


def tagged_square(tmp_path, points, symmetric):
    return write(
        tmp_path / "sym.vtu",
        points,
        [("line", SIDES), ("triangle", FOUR)],
        cell_data={"symmetry": [np.array(symmetric), np.zeros(4, int)]},
    )


def test_symmetry_lines_through_no_common_point_are_refused(tmp_path, capfd):
    words = "symmetry lines must be straight and run through one point"
    assert words in refusal(tagged_square(tmp_path, SQUARE, [1, 0, 1, 0]), capfd)  # parallel
    assert words in refusal(tagged_square(tmp_path, SQUARE, [1, 1, 0, 1]), capfd)  # three sides
    assert "there is no wall" in refusal(tagged_square(tmp_path, SQUARE, [1, 1, 1, 1]), capfd)


def test_curved_symmetry_lines_are_refused(tmp_path, capfd):
    points = [(0, 0), (1, 0), (0, 1), (0.5, -0.1), (0.5, 0.5), (0, 0.5)]
    path = write(
        tmp_path / "curved.vtu",
        points,
        [("line3", [(0, 1, 3)]), ("triangle6", [range(6)])],
        cell_data={"symmetry": [np.array([1]), np.array([0])]},
    )
    assert "must be straight" in refusal(path, capfd)


@pytest.mark.parametrize("angle", [np.pi / 2, np.pi / 7, np.pi / 64])
def test_symmetry_lines_of_a_sector_meet_in_the_origin(tmp_path, capfd, angle):
    turn = np.array([3.0, -2.0])
    rays = np.array([(np.cos(t), np.sin(t)) for t in (0.3, 0.3 + angle)])
    points = np.vstack([0.5 * rays, 1.0 * rays, 1.5 * rays]) + turn
    lines = [(0, 2), (2, 4), (1, 3), (3, 5)]
    path = write(
        tmp_path / "sector.vtu",
        points,
        [("line", lines), ("quad", [(0, 2, 3, 1), (2, 4, 5, 3)])],
        cell_data={"symmetry": [np.array([1, 1, 2, 2]), np.zeros(2, int)]},
    )
    assert read_quietly(path, capfd).origin == pytest.approx(tuple(turn), abs=1e-12)


def test_one_symmetry_line_has_the_origin_on_it(tmp_path, capfd):
    origin = read_quietly(tagged_square(tmp_path, SQUARE, [0, 1, 0, 0]), capfd).origin
    assert origin == pytest.approx((1, 0.5), abs=1e-14)


def test_names_that_only_contain_the_word_are_walls(tmp_path, capfd):
    path = write(
        tmp_path / "asym.vtu",
        SQUARE,
        [("line", SIDES), ("triangle", FOUR)],
        cell_data={"asymmetry": [np.array([1, 1, 1, 1]), np.zeros(4, int)]},
    )
    assert [b.symmetry for b in read_quietly(path, capfd).mesh().boundaries] == [False]


def test_named_lines_inside_are_reported(tmp_path):
    path = write(
        tmp_path / "fin.vtu",
        SQUARE,
        [("line", [(0, 4), (0, 1)]), ("triangle", FOUR)],
        cell_data={"fin": [np.array([4, 2]), np.zeros(4, int)]},
    )
    with pytest.warns(DuctsolveWarning, match="no part of the outline are not walls: fin 4") as caught:
        mesh = read_section(path).mesh()
    assert caught[0].filename == __file__
    assert {b.name for b in mesh.boundaries} == {"fin 2", "outer wall"}


# --- repairs ----------------------------------------------------------------------------------------


def test_points_in_one_place_are_merged_and_reported(tmp_path):
    points = [(0, 0), (1, 0), (1, 1), (0, 0), (1 + 1e-12, 1), (0, 1)]
    path = write(tmp_path / "double.vtu", points, [("triangle", [(0, 1, 2), (3, 4, 5)])])
    with pytest.warns(DuctsolveWarning, match=r"merged 2 points that lie on others, one at \(0, 0\) m"):
        section = read_section(path)
    assert len(section.mesh().triangles) == 2
    assert section.perimeter == pytest.approx(4, rel=1e-11)
    assert_conforming(section.mesh())


# --- refusals ---------------------------------------------------------------------------------------

TWO_SQUARES = [(0, 0), (1, 0), (1, 1), (0, 1), (3, 0), (4, 0), (4, 1), (3, 1)]
BAD = {
    "hanging node": (
        [(0, 0), (2, 0), (2, 2), (0, 2), (1, 0.5), (1, 1)],
        [(0, 4, 1), (1, 4, 5), (1, 5, 2), (0, 5, 4), (0, 2, 3)],
        r"hanging node at \(1, 1\) m",
    ),
    "hanging node in the middle of a side": (
        [(0, 0), (2, 0), (2, 1), (2, 2), (0, 2), (4, 1)],
        [(0, 1, 3), (0, 3, 4), (1, 5, 2), (2, 5, 3)],
        r"hanging node at \(2, 1\) m",
    ),
    "duplicated triangle": (SQUARE, [*FOUR, FOUR[2]], "triangles share the edge at"),
    "lone triangle, twice": (SQUARE, [FOUR[0], FOUR[0]], r"triangles overlap at .*: folded, or there twice"),
    "three triangles on a side": (
        [(0, 0), (1, 0), (0, 1), (1, 1), (0.3, 0.9)],
        [(0, 1, 2), (0, 1, 3), (0, 1, 4)],
        r"three or more triangles share the edge at \(0.5, 0\) m",
    ),
    "overlapping neighbours": (
        SQUARE[:4] + [(0.7, 0.2)],
        [(0, 1, 2), (0, 4, 2)],
        r"triangles overlap at \(0.5, 0.5\) m",
    ),
    "folded inside": ([*SQUARE[:4], (1.2, 0.5)], FOUR, "triangles overlap at"),
    "two parts": (
        TWO_SQUARES,
        [(0, 1, 2), (0, 2, 3), (4, 5, 6), (4, 6, 7)],
        "the mesh has 2 separate parts, one at",
    ),
    "meeting in a corner": (
        [(0, 0), (1, 0), (0, 1), (-1, 0), (0, -1)],
        [(0, 1, 2), (0, 3, 4)],
        r"triangles meet only in a corner at \(0, 0\) m",
    ),
    "no area": (
        [(0, 0), (1, 0), (2, 0), (0, 1)],
        [(0, 1, 2), (0, 2, 3)],
        r"the triangle at \(1, 0\) m has no area",
    ),
    "a corner twice": (SQUARE, [(0, 1, 1), *FOUR], "has no area"),
    "all in one place": ([(1, 1)] * 3, [(0, 1, 2)], "has no area"),
    "not a number": ([*SQUARE[:4], (0.5, np.nan)], FOUR, "a coordinate of point 5 is not a finite number"),
    "infinite": ([*SQUARE[:4], (0.5, np.inf)], FOUR, "a coordinate of point 5 is not a finite number"),
    "slit": (
        [(0, 0), (4, 0), (2, 3), (1.5, 1), (2.5, 1), (2, 1), (2, 1.00001)],
        [(0, 1, 5), (0, 5, 3), (1, 4, 5), (0, 3, 2), (3, 6, 2), (6, 4, 2), (4, 1, 2)],
        r"slit at \(",
    ),
}


@pytest.mark.filterwarnings("ignore::ductsolve.errors.DuctsolveWarning")
@pytest.mark.parametrize("name", BAD)
def test_meshes_that_do_not_tile_a_section_are_refused_with_the_place(tmp_path, capfd, name):
    points, cells, words = BAD[name]
    line = refusal(write(tmp_path / "bad.vtu", points, [("triangle", cells)]), capfd)
    assert re.search(words, line), line


def test_a_spiral_that_runs_over_itself_is_refused(tmp_path, capfd):
    """All triangles fit their neighbours, but after one and a half turns the strip crosses its beginning."""
    angle = np.linspace(0, 2.9 * np.pi, 40)
    unit = np.column_stack([np.cos(angle), np.sin(angle)])
    radius = 1 + 0.1 * angle[:, None]
    points = np.vstack([radius * unit, (radius + 1) * unit])
    k = np.arange(39)
    path = write(tmp_path / "spiral.vtu", points, [("quad", np.column_stack([k, k + 40, k + 41, k + 1]))])
    assert "the mesh overlaps itself: its outline crosses itself at" in refusal(path, capfd)


def test_mesh_out_of_plane_is_refused(tmp_path, capfd):
    points = np.column_stack([SQUARE, [0, 0, 0, 0, 0.1]])
    line = refusal(write(tmp_path / "z.vtu", points, [("triangle", FOUR)]), capfd)
    assert "must lie in a plane of constant z; its z runs from 0 to 0.1 m" in line


def test_curved_side_through_its_triangle_is_refused(tmp_path, capfd):
    points = [(0, 0), (1, 0), (0, 1), (0.5, 0.9), (0.5, 0.5), (0, 0.5)]
    line = refusal(write(tmp_path / "c.vtu", points, [("triangle6", [range(6)])]), capfd)
    assert "a curved side cuts through its triangle" in line


def test_other_cells_are_refused(tmp_path, capfd):
    points = np.eye(4, 3)
    assert "tetra cells are not supported" in refusal(
        write(tmp_path / "t.vtu", points, [("tetra", [range(4)])]), capfd
    )
    assert "no triangles" in refusal(write(tmp_path / "l.vtu", SQUARE, [("line", SIDES)]), capfd)


def test_reference_to_a_missing_point_is_refused(tmp_path, capfd):
    path = write(tmp_path / "lost.vtu", SQUARE, [("triangle", FOUR)])
    for number in (7, -1):
        meshio.Mesh(np.eye(5, 3), [("triangle", np.array([(0, 1, number)]))]).write(path)
        assert "refers to a point that is not in the file" in refusal(path, capfd)


@pytest.mark.parametrize("ending", ["msh", "vtu", "vtk", "xdmf"])
@pytest.mark.parametrize(
    "content",
    [
        b"",
        b"\n",
        b"\x00\xff" * 500,
        b"hello\n",
        b"<a></b>",
        b"<VTKFile/>",
        b"$MeshFormat\n4.1 1 8\n",
        b"$MeshFormat\n9 0 8\n",
    ],
)
def test_files_that_hold_no_mesh_are_refused(tmp_path, capfd, ending, content):
    path = tmp_path / f"junk.{ending}"
    path.write_bytes(content)
    line = refusal(path, capfd)
    assert f"not a readable .{ending} mesh" in line or "no triangles" in line


@pytest.mark.parametrize("name", FORMATS)
def test_truncated_files_are_refused(tmp_path, capfd, name):
    file, writer = FORMATS[name]
    points = np.column_stack([SQUARE, np.zeros(5)])
    writer(tmp_path / file, meshio.Mesh(points, [("triangle", np.array(FOUR))]))
    whole = (tmp_path / file).read_bytes()
    for part in (0.3, 0.6, 0.85):
        (tmp_path / file).write_bytes(whole[: int(part * len(whole))])
        refusal(tmp_path / file, capfd)


def test_paths_that_are_no_mesh_file(tmp_path, capfd):
    assert "this is a folder" in refusal(tmp_path, capfd)
    assert "no such file" in refusal(tmp_path / "gone.msh", capfd)
    (tmp_path / "duct.stl").write_text("solid")
    assert "unknown kind of mesh file '.stl'; known are .msh, .vtu" in refusal(tmp_path / "duct.stl", capfd)


def test_xdmf_without_its_reader_says_what_to_install(tmp_path, capfd, monkeypatch):
    path = write(tmp_path / "s.xdmf", SQUARE, [("triangle", FOUR)])
    monkeypatch.setitem(sys.modules, "h5py", None)
    assert "pip install h5py" in refusal(path, capfd)


def test_warnings_and_streams_are_left_as_they_were(tmp_path):
    before = (list(warnings.filters), sys.stdout, sys.stderr)
    read_section(write(tmp_path / "s.vtu", SQUARE, [("triangle", FOUR)]))
    assert (list(warnings.filters), sys.stdout, sys.stderr) == before


def test_large_meshes_are_read_in_a_moment(tmp_path, capfd):
    count = 200
    x, y = np.meshgrid(np.arange(count + 1), np.arange(count + 1), indexing="ij")
    n = np.arange(x.size).reshape(x.shape)
    quads = np.stack([n[:-1, :-1], n[1:, :-1], n[1:, 1:], n[:-1, 1:]], axis=-1).reshape(-1, 4)
    path = write(tmp_path / "large.vtu", np.column_stack([x.ravel(), y.ravel()]), [("quad", quads)])
    section = read_quietly(path, capfd)
    assert section.area == pytest.approx(count**2, rel=1e-12)
    assert len(section.mesh().triangles) == 2 * count**2
