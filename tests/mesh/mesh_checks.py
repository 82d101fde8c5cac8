"""What the tests of this folder check of a mesh, written without the code under test."""

import numpy as np

from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle

SIDES = ((0, 1, 3), (1, 2, 4), (2, 0, 5))
SHAPES = {
    "square": lambda: rectangle(1, 1),
    "slot": lambda: rectangle(1, 1000),
    "circle": lambda: circle(0.3),
    "ellipse": lambda: ellipse(2, 1),
    "slender ellipse": lambda: ellipse(0.02, 2),
    "annulus": lambda: annulus(1, 0.5),
    "narrow annulus": lambda: annulus(1, 0.99),
    "wire annulus": lambda: annulus(1, 0.01),
    "eccentric annulus": lambda: annulus(1, 0.5, 0.6),
    "narrow eccentric annulus": lambda: annulus(1, 0.99, 0.6),
    "nearly touching annulus": lambda: annulus(1, 0.5, 0.99),
    "eccentric wire": lambda: annulus(1, 0.05, 0.9),
}
CURVED = [name for name in SHAPES if name not in ("square", "slot")]


def triangle_areas(mesh):
    """Areas of the six-node triangles: their Jacobian is quadratic, and the mid-side rule exact for it."""
    nodes = mesh.points[mesh.triangles]
    total = 0
    for a, b, c in ((0.5, 0.5, 0), (0, 0.5, 0.5), (0.5, 0, 0.5)):
        by_a = np.array([4 * a - 1, 0, 0, 4 * b, 0, 4 * c])
        by_b = np.array([0, 4 * b - 1, 0, 4 * a, 4 * c, 0])
        by_c = np.array([0, 0, 4 * c - 1, 0, 4 * b, 4 * a])
        u, v = np.moveaxis((by_b - by_a) @ nodes, -1, 0), np.moveaxis((by_c - by_a) @ nodes, -1, 0)
        total = total + (u[0] * v[1] - u[1] * v[0]) / 6
    return total


def assert_conforming(mesh):
    """Every side has one mid-side node and lies between two triangles, or on the outline."""
    met = {}
    for triangle in mesh.triangles.tolist():
        for start, end, middle in SIDES:
            met.setdefault(triangle[middle], []).append((triangle[start], triangle[end]))
    for middle, sides in met.items():
        assert len(sides) <= 2
        if len(sides) == 2:
            assert sides[0] == sides[1][::-1]
            ends = mesh.points[list(sides[0])]
            assert np.abs(mesh.points[middle] - ends.mean(axis=0)).max() <= 1e-14 * np.abs(mesh.points).max()
    assert len(set(map(frozenset, (sides[0] for sides in met.values())))) == len(met)
    single = {middle: sides[0] for middle, sides in met.items() if len(sides) == 1}
    assert single == {middle: (start, end) for start, end, middle in mesh.edges.tolist()}
    assert set(mesh.triangles.ravel().tolist()) == set(range(len(mesh.points)))
    assert len(mesh.edge_boundary) == len(mesh.edges)
    assert (triangle_areas(mesh) > 0).all()


def smallest_angle(mesh):
    """Smallest angle [rad] between straight sides."""
    corners = mesh.points[mesh.triangles[:, :3]]
    u, v = np.roll(corners, -1, axis=1) - corners, np.roll(corners, 1, axis=1) - corners
    return np.arctan2(u[..., 0] * v[..., 1] - u[..., 1] * v[..., 0], (u * v).sum(axis=-1)).min()


def inside(points, loop):
    """Mask (n,) of the points within a polyline (m, 2), by the number of crossings of a ray."""
    x, y = points[:, None, 0], points[:, None, 1]
    (a, b), (c, d) = loop.T, np.roll(loop, -1, axis=0).T
    with np.errstate(divide="ignore", invalid="ignore"):
        crossing = ((b > y) != (d > y)) & (x < a + (y - b) * (c - a) / (d - b))
    return crossing.sum(axis=1) % 2 == 1
