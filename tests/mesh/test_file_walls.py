import numpy as np
import pytest
from mesh_checks import SHAPES
from mesh_writing import FOUR, SIDES, SQUARE, read_quietly, refusal, write

from ductsolve.errors import DuctsolveWarning
from ductsolve.mesh.files import read_section
from ductsolve.mesh.loops import outline_loops


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
        field_data={"mud": [5, 2], "Symmetry (midplane)": [3, 1], "inner pipe": [5, 1]},
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
2 1 "inside"
1 1 "warm side"
1 2 "cold side"
$EndPhysicalNames
$Entities
0 2 1 0
1 0 0 0 1 0 0 1 1 0
2 0 0 0 1 1 0 {second} 0
1 0 0 0 1 1 0 1 1 2 1 2
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


def test_one_oblique_symmetry_line_of_many_edges_has_the_origin_among_them(tmp_path, capfd):
    along, across = np.array([np.cos(0.7), np.sin(0.7)]), np.array([-np.sin(0.7), np.cos(0.7)])
    at = np.linspace(0, 1, 12)[:, None] ** 2
    points = np.round(np.vstack([at * along, at * along + across]) + (5, 3), 12)
    k = np.arange(11)
    path = write(
        tmp_path / "half.vtu",
        points,
        [("line", np.column_stack([k, k + 1])), ("quad", np.column_stack([k, k + 1, k + 13, k + 12]))],
        cell_data={"symmetry": [np.ones(11, int), np.zeros(11, int)]},
    )
    origin = np.array(read_quietly(path, capfd).origin) - (5, 3)
    assert origin @ across == pytest.approx(0, abs=1e-12)
    assert 0 < origin @ along < 1


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
