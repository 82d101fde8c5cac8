import numpy as np
import pytest
from scipy import integrate

from ductsolve.mesh.curves import EllipseArc
from ductsolve.mesh.triangles import edge_points

CIRCLE = EllipseArc((0.3, -0.2), (0.5, 0.5))
ELLIPSE = EllipseArc((-1.0, 2.0), (3.0, 0.2))


def on(curve, angle):
    angle = np.atleast_1d(angle)
    return np.column_stack([np.cos(angle), np.sin(angle)]) * curve.half_axes + curve.centre


def chord_and_parabola(curve, start, end):
    p, q = on(curve, start), on(curve, end)
    return np.stack([p, q, curve.mid_nodes(p, q)], axis=1)


@pytest.mark.parametrize("curve", [CIRCLE, ELLIPSE])
def test_projection_lands_on_the_curve_and_leaves_it_alone(curve):
    points = np.random.default_rng(1).normal(size=(50, 2)) + curve.centre
    there = curve.project(points)
    assert np.abs((((there - curve.centre) / curve.half_axes) ** 2).sum(axis=1) - 1).max() < 1e-14
    assert np.abs(curve.project(there) - there).max() < 1e-15 * 10


@pytest.mark.parametrize("curve", [CIRCLE, ELLIPSE])
@pytest.mark.parametrize("angle", [1e-6, 1e-3, 0.1, 0.299, 0.301, 1.0, 2.0])
def test_parabola_encloses_the_area_of_the_arc(curve, angle):
    start, end, middle = chord_and_parabola(curve, 0.4, 0.4 + angle)[0]
    chord, out = end - start, middle - start
    under_parabola = 2 / 3 * (out[0] * chord[1] - out[1] * chord[0])
    # The segment of the unit circle, scaled by the half axes: its height over the chord, integrated.
    exact, _ = integrate.quad(
        lambda s: 2 * np.sin((angle / 2 - s) / 2) * np.sin((angle / 2 + s) / 2) * np.cos(s),
        -angle / 2,
        angle / 2,
        epsrel=1e-13,
        epsabs=0,
    )
    # Digits are lost where the sagitta is small beside the chord: about 1e-16 / angle.
    assert under_parabola == pytest.approx(exact * np.prod(curve.half_axes), rel=1e-13 + 2e-15 / angle**2)


@pytest.mark.parametrize("curve", [CIRCLE, ELLIPSE])
def test_parabola_departs_from_the_arc_to_fourth_order(curve):
    deviation = []
    for angle in (0.1, 0.05, 0.025):
        nodes = chord_and_parabola(curve, 1.0, 1.0 + angle)
        at = np.vstack([edge_points(nodes, s) for s in np.linspace(0, 1, 41)])
        deviation.append(curve.distance(at).max())
    order = np.log2(np.array(deviation[:-1]) / deviation[1:])
    assert (np.abs(order - 4) < 0.1).all()


def test_distance_is_an_upper_bound():
    rng = np.random.default_rng(2)
    dense = on(ELLIPSE, np.linspace(0, 2 * np.pi, 20001))
    for point in on(ELLIPSE, rng.uniform(0, 2 * np.pi, 20)) + rng.normal(scale=0.01, size=(20, 2)):
        true = np.linalg.norm(dense - point, axis=1).min()
        assert ELLIPSE.distance(point[None])[0] >= true - 1e-6
    ring = on(CIRCLE, 1.0) * 1.0 + [[0.0, 0.0]]
    outwards = CIRCLE.centre + (ring - CIRCLE.centre) * 1.1
    assert CIRCLE.distance(outwards)[0] == pytest.approx(0.05)
