import re
import sys
import warnings

import meshio
import numpy as np
import pytest
from mesh_checks import assert_conforming
from mesh_writing import FORMATS, FOUR, SIDES, SQUARE, read_quietly, refusal, write

from ductsolve.errors import DuctsolveWarning
from ductsolve.mesh.files import read_section


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


def test_curved_triangles_folded_between_sound_corners_are_refused(tmp_path, capfd):
    """One side bulges across to the other in between, though all three corners are sound."""
    points = [(0, 0), (1, 0), (0.5, 2), (0.5, 0), (0.75, 1.5), (0.75, 0.8)]
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


def test_xdmf_files_that_mix_curved_cells_are_sent_to_another_format(tmp_path, capfd):
    points = [*SQUARE[:3], (0.5, 0), (1, 0.5), (0.5, 0.5)]
    path = write(tmp_path / "c.xdmf", points, [("line3", [(0, 1, 3)]), ("triangle6", [range(6)])])
    assert ".vtu files hold all kinds of cells" in refusal(path, capfd)


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
