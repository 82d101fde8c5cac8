"""Sections with closed-form outlines: rectangle, circle, ellipse, annulus.

Each section is solved on the part that its symmetry leaves, and knows how copies of that part tile it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from scipy import special

from ductsolve.errors import SectionError, is_finite_number
from ductsolve.mesh.curves import EllipseArc
from ductsolve.mesh.triangles import Boundary, Mesh, mesh_from_corners

LARGEST_ECCENTRICITY = 0.99
MOST_SLENDER_ELLIPSE = 1e5  # beyond, nodes at its tips cannot be told apart
FEWEST_SECTORS, MOST_SECTORS = 8, 64


@dataclass(frozen=True, eq=False)
class Section:
    """A flow area.

    Attributes
    ----------
    name : what it is, in words
    dimensions : the lengths [m] and ratios it was made from, by name
    area : area of the whole section [m2]
    perimeter : wetted perimeter of the whole section [m]
    coarse_mesh : makes the first mesh of the part that is solved
    copies : (n, 2, 3) affine maps of that part whose images tile the section, the identity first
    origin : (2,) point through which all symmetry lines run [m]
    """

    name: str
    dimensions: dict[str, float]
    area: float
    perimeter: float
    coarse_mesh: Callable[[], Mesh] = field(repr=False)
    copies: np.ndarray = field(default_factory=lambda: np.eye(2, 3)[None], repr=False)
    origin: tuple[float, float] = field(default=(0.0, 0.0), repr=False)

    @property
    def hydraulic_diameter(self) -> float:
        """Four times the area over the wetted perimeter [m]."""
        return 4 * self.area / self.perimeter

    def mesh(self) -> Mesh:
        """First mesh of the part that is solved."""
        return self.coarse_mesh()


def rectangle(width: float, height: float) -> Section:
    """Rectangle centred on the origin, ``width`` along x and ``height`` along y [m]."""
    width, height = _lengths(width=width, height=height)
    walls = (
        Boundary("side wall"),
        Boundary("top or bottom wall"),
        Boundary("symmetry line x = 0", symmetry=True),
        Boundary("symmetry line y = 0", symmetry=True),
    )
    half = np.array([width / 2, height / 2])

    def coarse():
        x = _graded(half[0], half.min())
        y = _graded(half[1], half.min())
        points, corners = _grid(x, y, lambda a, b: np.column_stack([a, b]))

        def side(ends):
            middle = ends.mean(axis=1) / half
            return np.argmax(np.column_stack([middle - 1, -middle]) > -1e-12, axis=1)

        return mesh_from_corners(points, corners, walls, side)

    return Section(
        name="rectangle",
        dimensions={"width": width, "height": height},
        area=width * height,
        perimeter=2 * (width + height),
        coarse_mesh=coarse,
        copies=_QUARTERS,
    )


def circle(diameter: float) -> Section:
    """Circle centred on the origin [m]."""
    (diameter,) = _lengths(diameter=diameter)
    radius = diameter / 2
    return Section(
        name="circle",
        dimensions={"diameter": diameter},
        area=math.pi * radius**2,
        perimeter=math.pi * diameter,
        coarse_mesh=lambda: _sector_mesh(radius, FEWEST_SECTORS),
        copies=_sector_copies(FEWEST_SECTORS),
    )


def ellipse(width: float, height: float) -> Section:
    """Ellipse centred on the origin, ``width`` along x and ``height`` along y [m]."""
    width, height = _lengths(width=width, height=height)
    if max(width, height) > MOST_SLENDER_ELLIPSE * min(width, height):
        raise SectionError(
            f"an ellipse of {width:g} m x {height:g} m is too slender; one side may exceed the other "
            f"{MOST_SLENDER_ELLIPSE:g} times"
        )
    half = (width / 2, height / 2)
    wall = EllipseArc((0.0, 0.0), half)
    boundaries = (
        Boundary("wall", curve=wall),
        Boundary("symmetry line y = 0", symmetry=True),
        Boundary("symmetry line x = 0", symmetry=True),
    )

    def coarse():
        points, corners = _pie(4, np.linspace(0, math.pi / 2, 5))

        def side(ends):
            middle = ends.mean(axis=1) / half
            return np.where(middle[:, 1] < 1e-9, 1, np.where(middle[:, 0] < 1e-9, 2, 0))

        return mesh_from_corners(points * half, corners, boundaries, side)

    return Section(
        name="ellipse",
        dimensions={"width": width, "height": height},
        area=math.pi * half[0] * half[1],
        perimeter=4 * max(half) * float(special.ellipe(1 - (min(half) / max(half)) ** 2)),
        coarse_mesh=coarse,
        copies=_QUARTERS,
    )


def annulus(outer_diameter: float, inner_diameter: float, eccentricity: float = 0.0) -> Section:
    """Annulus with the outer circle centred on the origin [m].

    ``eccentricity`` is the distance between the centres over the difference of the radii; the narrow
    side lies towards -y, as under a pipe that has sagged.
    """
    outer_diameter, inner_diameter = _lengths(outer_diameter=outer_diameter, inner_diameter=inner_diameter)
    eccentricity = _number("eccentricity", eccentricity)
    if inner_diameter >= outer_diameter:
        raise SectionError(
            f"outer_diameter {outer_diameter:g} m must exceed inner_diameter {inner_diameter:g} m"
        )
    if not 0 <= eccentricity <= LARGEST_ECCENTRICITY:
        raise SectionError(
            f"eccentricity {eccentricity:g} must lie between 0 (concentric) and {LARGEST_ECCENTRICITY:g}"
        )
    outer, inner = outer_diameter / 2, inner_diameter / 2
    common = {
        "dimensions": {
            "outer_diameter": outer_diameter,
            "inner_diameter": inner_diameter,
            "eccentricity": eccentricity,
        },
        "area": math.pi * (outer - inner) * (outer + inner),
        "perimeter": math.pi * (outer_diameter + inner_diameter),
    }
    if eccentricity == 0:
        sectors = _sectors_for(outer, inner)
        return Section(
            name="concentric annulus",
            coarse_mesh=lambda: _sector_mesh(outer, sectors, inner),
            copies=_sector_copies(sectors),
            **common,
        )
    return Section(
        name="eccentric annulus",
        coarse_mesh=lambda: _eccentric_mesh(outer, inner, eccentricity * (outer - inner)),
        copies=_SIDE_BY_SIDE,
        **common,
    )


def check_section(section) -> None:
    """Refuse what is no section."""
    if not isinstance(section, Section):
        raise SectionError(
            f"section must come from rectangle(...), annulus(...) or the like, found {section!r}"
        )


# --- copies -----------------------------------------------------------------------------------------


def _map(a, b, c, d):
    return [[a, b, 0.0], [c, d, 0.0]]


_QUARTERS = np.array([_map(sx, 0, 0, sy) for sx in (1, -1) for sy in (1, -1)], dtype=float)
_SIDE_BY_SIDE = np.array([_map(1, 0, 0, 1), _map(-1, 0, 0, 1)], dtype=float)


def _sector_copies(sectors):
    """Maps of the sector between angles 0 and pi/sectors onto the full circle, mirrored in turn."""
    maps = []
    for k in range(sectors):
        c, s = math.cos(2 * math.pi * k / sectors), math.sin(2 * math.pi * k / sectors)
        maps += [_map(c, -s, s, c), _map(c, s, s, -c)]
    return np.array(maps)


# --- first meshes -----------------------------------------------------------------------------------


def _graded(length, gap, growth=2.5, cells=4):
    """Grid lines on [0, length], fine towards the far end, for a section of half-gap ``gap``.

    Beside the end wall the flow changes over about one half-gap; behind, cells grow geometrically.
    """
    if length <= 4 * gap:
        return np.linspace(0, length, max(cells, math.ceil(cells * length / gap / 2)) + 1)
    steps = [gap / 2] * 4
    while sum(steps) < length:
        steps.append(steps[-1] * growth)
    lines = length - np.cumsum([0, *steps])
    lines = lines[lines > 0.25 * steps[-1]]
    return np.concatenate([[0], lines[::-1]])


def _grid(u, v, place):
    """Points and triangles of a mapped grid over lines u and v; ``place`` maps (u, v) to points."""
    a, b = np.meshgrid(u, v, indexing="ij")
    number = np.arange(a.size).reshape(a.shape)
    p, q, r, s = (n.ravel() for n in (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]))
    corners = np.vstack([np.column_stack([p, q, r]), np.column_stack([p, r, s])])
    return place(a.ravel(), b.ravel()), corners


def _pie(rings, angles):
    """Points and triangles of a unit sector: ``rings`` rings around the apex at the origin."""
    radii = np.arange(1, rings + 1) / rings
    points, corners = _grid(radii, angles, lambda r, t: np.column_stack([r * np.cos(t), r * np.sin(t)]))
    first = 1 + np.arange(len(angles))
    apex = np.column_stack([np.zeros(len(angles) - 1, dtype=int), first[:-1], first[1:]])
    return np.vstack([[0.0, 0.0], points]), np.vstack([apex, corners + 1])


def _sectors_for(outer, inner):
    """Number of sectors whose width is about the gap, within limits."""
    return int(np.clip(round(math.pi * (outer + inner) / (outer - inner) / 2), FEWEST_SECTORS, MOST_SECTORS))


def _sector_mesh(outer, sectors, inner=0.0):
    """Sector between angles 0 and pi/sectors of a circle or a concentric annulus."""
    angle = math.pi / sectors
    boundaries = (
        Boundary("outer wall" if inner else "wall", curve=EllipseArc((0.0, 0.0), (outer, outer))),
        Boundary("symmetry line below", symmetry=True),
        Boundary("symmetry line above", symmetry=True),
        *([Boundary("inner wall", curve=EllipseArc((0.0, 0.0), (inner, inner)))] if inner else []),
    )
    if inner:
        radii = np.linspace(inner, outer, 5)
        # Between lines the wall bulges by less than a sixteenth of the gap, a quarter of a ring.
        lines = 1 + math.ceil(angle / math.sqrt((outer - inner) / outer / 2))
        points, corners = _grid(
            radii, np.linspace(0, angle, lines), lambda r, t: np.column_stack([r * np.cos(t), r * np.sin(t)])
        )
    else:
        points, corners = _pie(4, np.array([0, angle]))
        points *= outer
    gap = outer - inner

    def side(ends):
        radius = np.linalg.norm(ends, axis=2)
        along = np.ptp(radius, axis=1) > 1e-6 * gap
        upper = np.arctan2(ends[..., 1].sum(axis=1), ends[..., 0].sum(axis=1)) > angle / 2
        outside = radius.mean(axis=1) > outer - gap / 2
        return np.where(along, np.where(upper, 2, 1), np.where(outside, 0, 3))

    return mesh_from_corners(points, corners, boundaries, side)


def _eccentric_mesh(outer, inner, offset):
    """Half (x >= 0) of an eccentric annulus, mapped conformally from a concentric one.

    The bilinear map z -> (w + c)/(1 + c w) keeps the unit circle and moves a concentric inner circle off
    centre; grid lines meet the walls at right angles whatever the eccentricity.
    """
    d, r = offset / outer, inner / outer
    total = 1 + d**2 - r**2
    c = 2 * d / (total + math.sqrt(total**2 - 4 * d**2))
    inner_image = (d + r - c) / (1 - c * (d + r))
    angles = _angles(c, 1 - inner_image)
    boundaries = (
        Boundary("outer wall", curve=EllipseArc((0.0, 0.0), (outer, outer))),
        Boundary("inner wall", curve=EllipseArc((0.0, -offset), (inner, inner))),
        Boundary("symmetry line, narrow side", symmetry=True),
        Boundary("symmetry line, wide side", symmetry=True),
    )

    def place(t, phi):
        w = inner_image ** (1 - t) * np.exp(1j * phi)
        z = outer * (w + c) / (1 + c * w)
        return np.column_stack([z.imag, -z.real])

    points, corners = _grid(np.linspace(0, 1, 3), angles, place)

    def side(ends):
        on_line = np.abs(ends[..., 0]).max(axis=1) < 1e-9 * outer
        narrow = ends[:, 0, 1] < -offset
        outside = np.linalg.norm(ends, axis=2).min(axis=1) > outer * (1 - 1e-9)
        return np.where(on_line, np.where(narrow, 2, 3), np.where(outside, 0, 1))

    points[np.abs(points[:, 0]) < 1e-12 * outer, 0] = 0.0
    return mesh_from_corners(points, corners, boundaries, side)


def _angles(c, mapped_gap, largest_turn=math.pi / 10, largest_gap_ratio=1.7):
    """Angles in the mapped plane from the narrow side (0) to the wide side (pi).

    From one line to the next the polar angle turns by at most ``largest_turn``, the gap between the walls
    (as a part of the outer radius) changes by at most ``largest_gap_ratio``, and the wall bulges between
    lines by less than a sixteenth of the gap, an eighth of a ring: bisecting stays well clear of it.
    """
    phi = np.linspace(0, math.pi, 4001)
    spread = 1 + c**2 + 2 * c * np.cos(phi)
    turn = (1 - c**2) / spread  # d(polar angle on the outer circle)/d(phi)
    gap = mapped_gap * (1 - c**2) / spread
    density = turn * np.maximum(1 / largest_turn, 1 / np.sqrt(gap / 2))
    density += 2 * c * np.sin(phi) / spread / math.log(largest_gap_ratio)
    count = np.concatenate([[0], np.cumsum((density[1:] + density[:-1]) / 2 * np.diff(phi))])
    lines = math.ceil(count[-1])
    return np.interp(np.linspace(0, count[-1], lines + 1), count, phi)


# --- input ------------------------------------------------------------------------------------------


def _number(name, value):
    if not is_finite_number(value):
        raise SectionError(f"{name} must be a finite number, found {value!r}")
    return float(value)


def _lengths(**named):
    """Positive finite lengths, or one line saying which is not."""
    for name, value in named.items():
        if _number(name, value) <= 0:
            raise SectionError(f"{name} must be a positive length in metres, found {value!r}")
    return [float(value) for value in named.values()]
