"""Pictures: what they show is checked through the figure, not by looking."""

import subprocess
import sys
import xml.etree.ElementTree as ElementTree

import matplotlib
import numpy as np
import pytest
from jobs import write_case

from ductsolve.app import colours, job, plots
from ductsolve.app.drawing import drawing, mesh_lines, smoothed, wall_pieces
from ductsolve.app.summary import display_of
from ductsolve.app.views import view_of

PICTURES = {
    "section": plots.section_picture,
    "velocity": plots.velocity_picture,
    "wall_shear": plots.wall_shear_picture,
}


@pytest.fixture(scope="module")
def outcomes(tmp_path_factory):
    folder = tmp_path_factory.mktemp("cases")
    return lambda name, cache={}: cache.setdefault(name, job.run(write_case(folder, name)))


@pytest.fixture(scope="module")
def scenes(outcomes):
    return lambda name: plots.scene(outcomes(name).flow, display_of(outcomes(name)))


def words(figure):
    """Everything that is written in a figure."""
    return " ".join(item.get_text() for item in figure.findobj(matplotlib.text.Text))


@pytest.mark.parametrize("kind", ["png", "svg"])
@pytest.mark.parametrize(("name", "picture"), [("ring", "velocity"), ("angle", "wall_shear")])
def test_files(scenes, name, picture, kind):
    data = plots.as_bytes(PICTURES[picture](scenes(name)), kind)
    if kind == "png":
        assert data.startswith(b"\x89PNG") and len(data) > 10_000
    else:
        assert ElementTree.fromstring(data).tag.endswith("svg")
        assert len(data) < 1_000_000


def test_drawing_leaves_no_trace():
    """In a process of its own, where nothing else has loaded or set anything."""
    code = (
        "import sys, matplotlib, ductsolve; settings = lambda: dict(dict.items(matplotlib.rcParams));"
        "before = settings();"
        "flow = ductsolve.solve(ductsolve.circle(0.1), ductsolve.Bingham(1.0, 1.0), flow_rate=1e-4);"
        "flow._repr_html_();"
        "assert settings() == before and 'matplotlib.pyplot' not in sys.modules"
    )
    subprocess.run([sys.executable, "-c", code], check=True)


@pytest.mark.parametrize("name", ["channel", "ring", "angle"])
def test_drawn_triangles_cover_the_section(outcomes, name):
    flow = outcomes(name).flow
    drawn = drawing(flow.mesh)
    a, b, c = (drawn.points[drawn.triangles[:, k]] for k in range(3))
    u, v = b - a, c - a
    areas = (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]) / 2
    assert (areas > 0).all()
    assert areas.sum() == pytest.approx(flow.section.area, rel=1e-3)  # straight chords
    assert len(np.unique(drawn.points.round(12), axis=0)) == len(drawn.points)
    assert drawn.values(flow.mesh.points[:, 0]) == pytest.approx(drawn.points[:, 0], abs=1e-12)


def test_lines_of_the_mesh_are_drawn_once(outcomes):
    mesh = outcomes("channel").flow.mesh
    assert len(mesh_lines(mesh)) == len(np.unique(mesh.triangles[:, 3:]))


@pytest.mark.parametrize("name", ["channel", "ring", "angle"])
def test_pieces_of_wall_belong_to_their_stress(outcomes, name):
    flow = outcomes(name).flow
    pieces, wall = wall_pieces(flow), flow.wall_shear
    assert pieces[:, pieces.shape[1] // 2] == pytest.approx(wall.position, abs=1e-12)
    lengths = np.linalg.norm(np.diff(pieces, axis=1), axis=2).sum(axis=1)
    assert lengths == pytest.approx(wall.length, rel=1e-3)


def test_compact_sections_are_true_to_scale(scenes):
    figure = plots.section_picture(scenes("channel"))
    assert figure.axes[0].get_aspect() == 1
    assert "stretched" not in words(figure)
    assert "Rectangle, width 150 mm, height 80 mm" in words(figure)


def test_slender_sections_are_stretched_and_say_so(scenes):
    figure = plots.velocity_picture(scenes("slot"))
    whole, end = figure.axes[:2]
    assert "stretched" in whole.get_xlabel() and "One end at true scale" in words(figure)
    assert whole.get_aspect() == "auto" and end.get_aspect() == 1
    stretch = float(whole.get_xlabel().split("stretched ")[1].split()[0])
    box = whole.get_window_extent()
    scales = box.width / np.ptp(whole.get_xlim()), box.height / np.ptp(whole.get_ylim())
    assert stretch == pytest.approx(scales[0] / scales[1], rel=0.06)


def test_thin_rings_are_unrolled(scenes, outcomes):
    scene = scenes("ring")
    half, gap = np.pi * 50, 2.0  # mm
    assert scene.view.extents[:, 0] == pytest.approx([-half, half])
    assert scene.view.extents[1, 1] == pytest.approx(gap * 1.3, rel=1e-2)
    assert "from the outer wall" in words(plots.section_picture(scene))


def test_unrolling_keeps_every_triangle(outcomes, scenes):
    scene = scenes("ring")
    points, triangles, source = scene.view.triangles(scene.mesh.points, scene.mesh.triangles)
    spans = np.ptp(points[triangles, 0], axis=1)
    assert spans.max() < 0.1 * np.ptp(scene.view.extents[:, 0])
    assert set(source) == set(range(len(scene.mesh.points)))
    depth = 50 - 1e3 * np.linalg.norm(scene.mesh.points, axis=1)[source]
    assert points[:, 1] == pytest.approx(depth, abs=1e-9)


def test_wide_rings_stay_round(outcomes):
    from ductsolve import PowerLaw, annulus, solve

    flow = solve(annulus(0.1, 0.05), PowerLaw(1.0, 0.5), flow_rate=1e-3)
    view = view_of(flow, display_of(outcomes("ring")).length)
    assert not view.ring and not view.stretched


def test_unyielded_fluid_is_hatched(scenes):
    assert "hatched: looks unyielded" in words(plots.velocity_picture(scenes("channel")))
    assert "hatched" not in words(plots.velocity_picture(scenes("slot")))
    assert "Nothing flows; hatched" in words(plots.velocity_picture(scenes("stuck")))


def test_unbounded_stress_does_not_set_the_scale(scenes, outcomes):
    figure = plots.wall_shear_picture(scenes("angle"))
    top = outcomes("angle").flow.wall_shear.largest_away[0]
    assert figure.axes[0].get_ylim()[1] == pytest.approx(1.1 * top, rel=1e-6)
    assert "unbounded at re-entrant corners" in words(figure)


def test_units_of_the_case_are_on_the_axes(scenes):
    text = words(plots.wall_shear_picture(scenes("ring")))
    assert "wall shear stress [Pa]" in text and "[mm]" in text
    assert "outer wall" in text and "inner wall" in text


@pytest.mark.parametrize("ramp", [colours.VELOCITY, colours.STRESS])
def test_ramps_darken_evenly(ramp):
    """Luminance by the sRGB standard, to the third root as the eye has it."""
    encoded = ramp(np.arange(colours.STEPS))[:, :3]
    linear = np.where(encoded <= 0.04045, encoded / 12.92, ((encoded + 0.055) / 1.055) ** 2.4)
    lightness = np.cbrt(linear @ [0.2126, 0.7152, 0.0722])
    steps = -np.diff(lightness)
    assert (steps > 0).all()
    assert steps.max() < 2.5 * steps.mean()


def test_smoothing_takes_out_scatter_and_keeps_a_quadratic(outcomes):
    mesh = outcomes("channel").flow.mesh
    x, y = mesh.points.T / np.ptp(mesh.points)
    smooth = 1 + x - 2 * y + 3 * x * y + y**2
    assert smoothed(mesh, smooth) == pytest.approx(smooth, rel=1e-6)
    scatter = np.random.default_rng(1).normal(0, 0.01, len(smooth))
    assert np.std(smoothed(mesh, smooth + scatter) - smooth) < 0.8 * np.std(scatter)
