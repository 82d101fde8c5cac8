"""Sections drawn by the corners of their outline."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

import numpy as np
from scipy import spatial

from ductsolve.errors import SectionError
from ductsolve.mesh.conformity import check_mesh, contacts, first_contact, place
from ductsolve.mesh.loops import centroid, edge_areas, edge_lengths
from ductsolve.mesh.sections import Section
from ductsolve.mesh.triangles import SAME_PLACE, Boundary, mesh_from_corners

# A side is Delaunay when the cotangents of the two angles opposite it do not add up to less than this.
DELAUNAY = -1e-9
# Spacing of inner points: what it grows by with the distance from the outline, and how far from a point
# another has room (the root of two is Liepa's); sides longer than this many spacings opposite are long.
GROWTH, SPACING, LONG = 0.4, 2**0.5, 3


def polygon(points, holes=()) -> Section:
    """Polygon with the given corners, less polygonal holes.

    Parameters
    ----------
    points : (n, 2) corners of the outer wall in order, either way round; repeating the first is allowed [m]
    holes : sequence of the same

    Raises
    ------
    SectionError : when an outline crosses or touches itself or another, or has no area; when corners
        coincide; when a hole lies outside
    """
    loops = [_loop("points", points), *(_loop(f"hole {k}", hole)[::-1] for k, hole in enumerate(holes, 1))]
    corners = np.vstack(loops)
    lengths = [len(loop) for loop in loops]
    ends = np.cumsum(lengths)
    rings = [list(range(end - length, end)) for end, length in zip(ends, lengths, strict=True)]
    _check_drawing(corners, rings)
    owner = np.repeat(np.arange(len(loops)), lengths)
    mesh = _first_mesh(corners, rings, owner)
    nodes = mesh.points[mesh.edges]
    origin = centroid(mesh)
    count = len(loops) - 1
    with_holes = f" with {count} hole{'s' if count > 1 else ''}" if count else ""
    return Section(
        name=f"polygon of {lengths[0]} sides{with_holes}",
        dimensions={},
        area=float(edge_areas(nodes - origin).sum()),
        perimeter=float(edge_lengths(nodes).sum()),
        coarse_mesh=lambda: mesh,
        origin=(float(origin[0]), float(origin[1])),
    )


# --- input ------------------------------------------------------------------------------------------


def _loop(name, points):
    """Corners (n, 2) of one loop, counter-clockwise."""
    try:
        points = np.array(points, dtype=float)
    except (TypeError, ValueError):
        raise SectionError(f"{name} must be a list of (x, y) in metres, found {points!r:.60}") from None
    if points.ndim != 2 or points.shape[1] != 2:
        raise SectionError(
            f"{name} must be a list of (x, y) in metres, found an array of shape {points.shape}"
        )
    if not np.isfinite(points).all():
        row = np.flatnonzero(~np.isfinite(points).all(axis=1))[0]
        raise SectionError(f"{name}: corner {row + 1} has a coordinate that is not a finite number")
    if len(points) > 1 and (points[0] == points[-1]).all():
        points = points[:-1]
    if len(points) < 3:
        raise SectionError(f"{name} must have at least three corners, found {len(points)}")
    return points if _area(points) > 0 else points[::-1]


def _area(points):
    """Signed area enclosed by the corners (n, 2) of a loop."""
    x, y = (points - points[0]).T
    return float(x @ np.roll(y, -1) - y @ np.roll(x, -1)) / 2


def _check_drawing(points, rings):
    size = np.ptp(points, axis=0).max()
    same = spatial.cKDTree(points).query_pairs(SAME_PLACE * size, output_type="ndarray")
    if len(same):
        raise SectionError(f"two corners of the outline lie at {place(points[same[0, 0]])}")
    for ring in rings:
        length, width = np.linalg.svd(points[ring] - points[ring].mean(axis=0), compute_uv=False)
        if width <= SAME_PLACE * length:
            raise SectionError(f"the outline from {place(points[ring[0]])} on has no area")
    contact = first_contact(points, _sides(rings))
    if contact:
        verb = "crosses" if contact[1] else "touches"
        raise SectionError(f"the outline {verb} itself at {place(contact[0])}")
    outer, *holes = (points[ring] for ring in rings)
    for hole in holes:
        if not _inside(hole[0], outer):
            raise SectionError(f"the hole with a corner at {place(hole[0])} lies outside the section")
    for one, other in combinations(holes, 2):
        for a, b in ((one, other), (other, one)):
            if _inside(a[0], b):
                raise SectionError(f"the hole with a corner at {place(a[0])} lies in another hole")


def _sides(rings):
    """Sides (n, 2) of all rings."""
    return np.vstack([np.column_stack([ring, np.roll(ring, -1)]) for ring in rings])


def _inside(point, loop):
    """Whether a point lies within a loop (n, 2): a ray towards +x crosses it an odd number of times."""
    (x, y), (u, v) = (loop - point).T, (np.roll(loop, -1, axis=0) - point).T
    crossing = (y > 0) != (v > 0)
    with np.errstate(divide="ignore", invalid="ignore"):
        return bool((crossing & (x - y * (u - x) / (v - y) > 0)).sum() % 2)


# --- triangles --------------------------------------------------------------------------------------


def _first_mesh(points, rings, owner):
    """Mesh of the outline, with points inside where corners lie close, and on long sides facing those."""
    sides = _sides(rings)
    length = np.linalg.norm(points[sides[:, 1]] - points[sides[:, 0]], axis=1)
    spacing = np.zeros(len(points))
    np.add.at(spacing, sides, length[:, None] / 2)
    apex = {}
    for corners in _clip_ears(points, _bridged(points, rings)):
        _add(apex, *corners)
    points, spacing = list(map(tuple, points.tolist())), spacing.tolist()
    owner = dict(enumerate(owner.tolist()))
    _relax(points, apex, list(apex))
    while _thicken(points, apex, spacing) + _split_sides(points, apex, spacing, owner):
        _relax(points, apex, list(apex))
    walls = [Boundary("outer wall"), *(Boundary(f"hole {k} wall") for k in range(1, len(rings)))]
    mesh = mesh_from_corners(points, _triangles(apex), walls, lambda ends: np.zeros(len(ends)))
    mesh = replace(mesh, edge_boundary=np.array([owner[k] for k in mesh.edges[:, 0]]))
    check_mesh(mesh)
    return mesh


def _bridged(points, rings):
    """One ring through all loops: holes, from right to left, are joined to it by bridges there and back."""
    ring, *holes = rings
    walls = _sides(rings)
    for hole in sorted(holes, key=lambda hole: -points[hole, 0].max()):
        turn = int(points[hole, 0].argmax())
        hole = hole[turn:] + hole[:turn]
        near = np.argsort(np.linalg.norm(points[ring] - points[hole[0]], axis=1), kind="stable")
        at = next((k for k in near if _sees(points, ring, k, hole[0], walls)), None)
        if at is None:
            raise SectionError(f"the hole with a corner at {place(points[hole[0]])} cannot be reached")
        walls = np.vstack([walls, [ring[at], hole[0]]])
        ring = ring[: at + 1] + hole + hole[:1] + ring[at:]
    return ring


def _sees(points, ring, at, target, walls):
    """Whether the straight line from the ring's item ``at`` to ``target`` runs inside, clear of the walls."""
    here, before, after = (points[ring[k % len(ring)]] for k in (at, at - 1, at + 1))
    to_target, to_before, to_after = (np.arctan2(*(p - here)[::-1]) for p in (points[target], before, after))
    if (to_target - to_after) % (2 * np.pi) >= (to_before - to_after) % (2 * np.pi):
        return False
    line = np.broadcast_to([ring[at], target], walls.shape)
    crossing, touching, _ = contacts(points, line, walls)
    return not (crossing | touching).any()


def _clip_ears(points, ring):
    """Triangles of a ring of corners: cut off, again and again, one that holds no other corner."""
    ring = list(ring)
    size = np.ptp(points, axis=0).max()
    triangles, at, refused = [], 0, 0
    while len(ring) > 3:
        at %= len(ring)
        ear = [ring[at - 1], ring[at], ring[(at + 1) % len(ring)]]
        if _is_ear(points, ring, ear, size):
            triangles.append(ear)
            del ring[at]
            refused = 0
        else:
            refused += 1
        at += 1
        if refused > len(ring):
            raise SectionError(
                f"the outline is too narrow to be cut into triangles at {place(points[ear[1]])}"
            )
    return [*triangles, ring]


def _is_ear(points, ring, ear, size):
    """Whether a triangle has area and no other corner of the ring in or on it."""
    a, b, c = points[ear]
    others = points[np.setdiff1d(ring, ear)]
    held = np.ones(len(others), dtype=bool)
    for p, q, opposite in ((a, b, c), (b, c, a), (c, a, b)):
        u, v = (q - p) / np.linalg.norm(q - p)
        height = u * (opposite[1] - p[1]) - v * (opposite[0] - p[0])
        if height <= SAME_PLACE * size:
            return False
        held &= u * (others[:, 1] - p[1]) - v * (others[:, 0] - p[0]) >= -SAME_PLACE * size
    return not held.any()


# Triangles are kept as the corner opposite each side: apex[a, b] = c for a, b, c counter-clockwise. Sides
# of the outline have no reverse.


def _add(apex, a, b, c):
    apex[a, b], apex[b, c], apex[c, a] = c, a, b


def _triangles(apex):
    """Corners (n, 3) of all triangles."""
    return np.array([(a, b, c) for (a, b), c in apex.items() if a < b and a < c])


def _relax(points, apex, stack):
    """Flip the inner sides of a stack, and those around them, until all are Delaunay (Lawson 1977)."""
    while stack:
        a, b = stack.pop()
        if (a, b) not in apex or (b, a) not in apex:
            continue
        c, d = apex[a, b], apex[b, a]
        if (
            _cotangent(points[c], points[a], points[b]) + _cotangent(points[d], points[b], points[a])
            < DELAUNAY
        ):
            del apex[a, b], apex[b, a]
            _add(apex, c, d, b)
            _add(apex, d, c, a)
            stack += [(a, d), (d, b), (b, c), (c, a)]


def _cotangent(p, a, b):
    """Cotangent of the angle at p from a to b."""
    ux, uy, vx, vy = a[0] - p[0], a[1] - p[1], b[0] - p[0], b[1] - p[1]
    return (ux * vx + uy * vy) / (ux * vy - uy * vx)


def _thicken(points, apex, spacing):
    """Put points into the middle of triangles with room for them; their number (after Liepa 2003).

    A polygon with few corners has none such; in one with many short sides the points grow sparser
    inwards, and slivers from wall to wall vanish.
    """
    before = len(points)
    for corners in _triangles(apex).tolist():
        a, b, c = corners
        if apex.get((a, b)) != c:
            continue  # gone since the points before this one
        centre = tuple(sum(points[k][axis] for k in corners) / 3 for axis in (0, 1))
        gaps = [np.hypot(points[k][0] - centre[0], points[k][1] - centre[1]) for k in corners]
        wanted = min(spacing[k] + GROWTH * gap for gap, k in zip(gaps, corners, strict=True))
        if all(SPACING * gap > max(wanted, spacing[k]) for gap, k in zip(gaps, corners, strict=True)):
            new = len(points)
            points.append(centre)
            spacing.append(wanted)
            for side in ((a, b), (b, c), (c, a)):
                _add(apex, *side, new)
            _relax(points, apex, [(a, b), (b, c), (c, a)])
    return len(points) - before


def _split_sides(points, apex, spacing, owner):
    """Halve outline sides that are long for the spacing at the obtuse corner opposite; their number."""
    before = len(points)
    for a, b in list(apex):
        if (b, a) in apex:
            continue
        c = apex[a, b]
        (ax, ay), (bx, by), (cx, cy) = (points[k] for k in (a, b, c))
        length = np.hypot(bx - ax, by - ay)
        obtuse = (ax - cx) * (bx - cx) + (ay - cy) * (by - cy) < 0
        if obtuse and length > LONG * spacing[c]:
            new = len(points)
            points.append(((ax + bx) / 2, (ay + by) / 2))
            spacing.append(length / 2)
            owner[new] = owner[a]
            del apex[a, b]
            _add(apex, a, new, c)
            _add(apex, new, b, c)
    return len(points) - before
