"""Sections read from mesh files."""

from __future__ import annotations

import contextlib
import io
import re
import warnings
from dataclasses import replace
from pathlib import Path

import meshio
import numpy as np
from scipy import sparse, spatial
from scipy.sparse import csgraph

from ductsolve.errors import DuctsolveWarning, SectionError
from ductsolve.mesh.conformity import check_mesh, place
from ductsolve.mesh.loops import centroid, edge_areas, edge_lengths, outline_loops
from ductsolve.mesh.sections import Section
from ductsolve.mesh.triangles import SAME_PLACE, Boundary, mesh_from_corners, signed_areas

READERS = {
    ".msh": meshio.gmsh.read,
    ".vtu": meshio.vtu.read,
    ".vtk": meshio.vtk.read,
    ".xdmf": meshio.xdmf.read,
    ".xmf": meshio.xdmf.read,
}
# Corners and nodes of the cells that make the section, nodes of those that name its walls.
AREAS = {"triangle": (3, 3), "triangle6": (3, 6), "triangle7": (3, 7)}
AREAS |= {"quad": (4, 4), "quad8": (4, 8), "quad9": (4, 9)}
LINES = {"line": 2, "line3": 3}


def read_section(path: str | Path, unit: float = 1.0) -> Section:
    """Section covered by the triangles of a mesh file, with the outline as its walls.

    Parameters
    ----------
    path : a .msh (2 or 4), .vtu, .vtk or .xdmf file. Triangles and quadrilaterals, straight or with mid-side
        nodes (curved sides on the outline are kept, those inside are straightened), in the x-y plane.
    unit : metres per unit of the file's coordinates

    Line cells on the outline name the walls by their physical group or by integer arrays (zero names
    nothing); without line cells integer point arrays do; the rest is "outer wall", "hole 1 wall", ...,
    holes from left to right. Walls named "symmetry" are symmetry lines: straight, all through one
    point. Area and perimeter are then those of the part in the file, and so is the flow rate.

    Raises
    ------
    SectionError : when the file cannot be read or its cells do not tile one section
    """
    path = Path(path)
    unit = _unit(unit)
    try:
        mesh = _mesh(_load(path), unit)
        origin = _origin(mesh)
    except SectionError as error:
        raise SectionError(f"{path.name}: {error}") from None
    nodes = mesh.points[mesh.edges]
    return Section(
        name=f"section from {path.name}",
        dimensions={},
        area=float(edge_areas(nodes - origin).sum()),
        perimeter=float(edge_lengths(mesh.points[mesh.wall_edges]).sum()),
        coarse_mesh=lambda: mesh,
        origin=(float(origin[0]), float(origin[1])),
    )


def _unit(unit):
    if isinstance(unit, bool | str) or not np.isscalar(unit) or not 0 < unit < np.inf:
        raise SectionError(f"unit must be a positive number of metres, found {unit!r}")
    return float(unit)


# --- the file ---------------------------------------------------------------------------------------


def _load(path):
    """The file as meshio sees it. Whatever goes wrong in there becomes one line."""
    if path.is_dir():
        raise SectionError("this is a folder; give a mesh file")
    if not path.exists():
        raise SectionError("no such file")
    kind = path.suffix.lower()
    if kind not in READERS:
        raise SectionError(f"unknown kind of mesh file {kind!r}; known are {', '.join(READERS)}")
    silence = io.StringIO()
    try:
        with contextlib.redirect_stdout(silence), contextlib.redirect_stderr(silence):
            with warnings.catch_warnings(action="ignore"):
                return READERS[kind](str(path))
    except ModuleNotFoundError as error:
        raise SectionError(f"{kind} files need the package {error.name}: pip install {error.name}") from None
    except (Exception, SystemExit) as error:
        raise SectionError(f"not a readable {kind} mesh ({_reason(error)})") from None


def _reason(error):
    """What a reader complained of, in one short line."""
    text = " ".join(str(error).split())
    if isinstance(error, KeyError):
        return f"no reader for its part {text}; .vtu files hold all kinds of cells"
    if "gmsh:physical" in text:
        return "some cells are in a physical group and some in none: put every curve and surface in one"
    return text[:120] or type(error).__name__


def _mesh(raw, unit):
    """Checked mesh with named boundaries from what meshio read."""
    points = np.asarray(raw.points, dtype=float) * unit
    corners, sides = _cells(raw, points)
    used = np.unique(np.concatenate([corners.ravel(), sides.ravel()]))
    _check_points(points, used)
    points = points[:, :2]
    number, kept = _merged(points, np.unique(corners))
    mesh = mesh_from_corners(points[kept], number[corners], (Boundary("wall"),), lambda e: np.zeros(len(e)))
    mesh = _with_curved_sides(mesh, number, sides, points)
    check_mesh(mesh)
    names = _names_from_lines(raw, mesh, number)
    if names is None:
        names = _names_from_points(raw, mesh, kept)
    return _with_names(mesh, names)


def _cells(raw, points):
    """Corners (n, 3) of all triangles, and start, end and mid-side node (m, 3) of sides that have one."""
    triangles, sides = [np.empty((0, 3), dtype=int)], [np.empty((0, 3), dtype=int)]
    for block in raw.cells:
        if block.type in LINES or block.type == "vertex":
            continue
        if block.type not in AREAS:
            raise SectionError(f"{block.type} cells are not supported; use triangles or quads")
        k, nodes = AREAS[block.type]
        cells = _nodes(block, nodes, len(points))
        corners = cells[:, :k]
        triangles.append(corners if k == 3 else _halves(points, corners))
        if nodes >= 2 * k:
            ends = [corners, np.roll(corners, -1, axis=1), cells[:, k : 2 * k]]
            sides.append(np.stack(ends, axis=2).reshape(-1, 3))
    triangles = np.vstack(triangles)
    if not len(triangles):
        raise SectionError("no triangles in the file")
    return triangles, np.vstack(sides)


def _nodes(block, nodes, count):
    """Point numbers (n, nodes) of a block of cells, checked."""
    cells = np.asarray(block.data)
    if cells.shape != (len(cells), nodes) or cells.dtype.kind not in "iu":
        raise SectionError(f"the {block.type} cells are incomplete: is the file whole?")
    if cells.size and (cells.min() < 0 or cells.max() >= count):
        raise SectionError(f"a {block.type} cell refers to a point that is not in the file")
    return cells.astype(int)


def _halves(points, quads):
    """Triangles of quads cut along the diagonal whose lesser half is the larger, in either orientation:
    both diagonals give the same signed sum."""
    a, b, c, d = quads.T
    cuts = [[np.column_stack(t) for t in cut] for cut in ([(a, b, c), (a, c, d)], [(b, c, d), (b, d, a)])]
    lesser = [np.min([signed_areas(points, half) for half in cut], axis=0) for cut in cuts]
    first = (lesser[0] >= lesser[1])[:, None]
    return np.vstack([np.where(first, one, other) for one, other in zip(*cuts, strict=True)])


def _check_points(points, used):
    bad = ~np.isfinite(points[used]).all(axis=1)
    if bad.any():
        raise SectionError(f"a coordinate of point {used[bad.argmax()] + 1} is not a finite number")
    if points.shape[1] < 3:
        return
    low, high = points[used].min(axis=0), points[used].max(axis=0)
    if high[2] - low[2] > SAME_PLACE * (high - low).max():
        span = f"{low[2]:.6g} to {high[2]:.6g} m"
        raise SectionError(f"the mesh must lie in a plane of constant z; its z runs from {span}")


def _merged(points, used):
    """New number (n_points,) of each used point, points in one place sharing theirs, -1 for the others;
    and the old numbers of the points that remain."""
    tolerance = SAME_PLACE * np.ptp(points[used], axis=0).max()
    pairs = spatial.cKDTree(points[used]).query_pairs(tolerance, output_type="ndarray")
    graph = sparse.csr_array((np.ones(len(pairs)), tuple(pairs.T)), shape=(len(used),) * 2)
    group = csgraph.connected_components(graph, directed=False)[1]
    first = np.unique(group, return_index=True)[1]
    merged = len(used) - len(first)
    if merged:
        where = place(points[used[pairs.min()]])
        message = f"merged {merged} points that lie on others, one at {where}"
        warnings.warn(message, DuctsolveWarning, stacklevel=4)
    number = np.full(len(points), -1)
    number[used] = group
    return number, used[first]


# --- the outline ------------------------------------------------------------------------------------


def _find_edges(mesh, ends):
    """Outline edge (n,) between each pair of corners (n, 2), -1 where there is none."""
    count = len(mesh.points)
    key = np.sort(mesh.edges[:, :2], axis=1) @ [count, 1]
    wanted = np.sort(ends, axis=1) @ [count, 1]
    order = np.argsort(key)
    at = order[np.minimum(np.searchsorted(key[order], wanted), len(order) - 1)]
    return np.where(key[at] == wanted, at, -1)


def _with_curved_sides(mesh, number, sides, points):
    """The mesh with the file's own mid-side nodes on its outline."""
    if not len(sides):
        return mesh
    edge = _find_edges(mesh, number[sides[:, :2]])
    moved = mesh.points.copy()
    moved[mesh.edges[edge[edge >= 0], 2]] = points[sides[edge >= 0, 2]]
    return replace(mesh, points=moved)


def _names_from_lines(raw, mesh, number):
    """Names (n_edges,) from the line cells, None when they name nothing."""
    names = np.full(len(mesh.edges), "", dtype=object)
    for index, block in enumerate(raw.cells):
        if block.type not in LINES:
            continue
        lines = _nodes(block, LINES[block.type], len(number))
        labels = _labels(raw, {key: values[index] for key, values in raw.cell_data.items()}, len(lines))
        ends = number[lines[:, :2]]
        edge = np.where((ends >= 0).all(axis=1), _find_edges(mesh, ends), -1)
        inside = (edge < 0) & (labels != "")
        if inside.any():
            lost = sorted(set(labels[inside]))
            message = f"lines that are no part of the outline are not walls: {', '.join(lost)}"
            warnings.warn(message, DuctsolveWarning, stacklevel=4)
        names[edge[edge >= 0]] = labels[edge >= 0]
    return names if (names != "").any() else None


def _names_from_points(raw, mesh, kept):
    """Names (n_edges,) from integer point arrays: an edge between two names continues the straighter way."""
    labels = _labels(raw, raw.point_data, len(raw.points))[kept]
    along = mesh.points[mesh.edges[:, 1]] - mesh.points[mesh.edges[:, 0]]
    along /= np.linalg.norm(along, axis=1, keepdims=True)
    names = np.empty(len(mesh.edges), dtype=object)
    for loop in outline_loops(mesh):
        way = along[loop]
        turn = (way * np.roll(way, -1, axis=0)).sum(axis=1)  # cosine of the turn at each edge's end
        names[loop] = labels[mesh.edges[loop, np.where(turn > np.roll(turn, 1), 1, 0)]]
    return names


def _labels(raw, arrays, count):
    """Names (count,) that integer arrays give, "" where all are zero; the first array with a value wins."""
    labels = np.full(count, "", dtype=object)
    for array, values in arrays.items():
        values = np.asarray(values)
        if values.dtype.kind not in "iu" or values.size != count or array == "gmsh:geometrical":
            continue
        values = values.ravel()
        tags = np.unique(values[values != 0])
        if len(tags) > max(8, count / 2):
            continue  # a numbering of the cells or points, not names
        for tag in tags:
            labels[(values == tag) & (labels == "")] = _label(raw, array, tag)
    return labels


def _label(raw, array, tag):
    if array != "gmsh:physical":
        return f"{array} {tag}"
    named = [name for name, (number, dimension) in raw.field_data.items() if (number, dimension) == (tag, 1)]
    return named[0] if named else f"wall {tag}"


def _with_names(mesh, names):
    """The mesh with its boundaries named, those without a name after their loop."""
    for number, loop in enumerate(outline_loops(mesh)):
        nameless = loop[names[loop] == ""]
        names[nameless] = f"hole {number} wall" if number else "outer wall"
    unique, edge_boundary = np.unique(names.astype(str), return_inverse=True)
    boundaries = tuple(Boundary(str(name), symmetry=_is_symmetry(name)) for name in unique)
    return replace(mesh, edge_boundary=edge_boundary, boundaries=boundaries)


def _is_symmetry(name):
    return re.search("(?<![a-z])symmetry", name.lower()) is not None


def _origin(mesh):
    """The point through which all symmetry lines run; without any, the centroid."""
    if not mesh.symmetry_edges.any():
        return centroid(mesh)
    if mesh.symmetry_edges.all():
        raise SectionError("the whole outline is named symmetry: there is no wall")
    nodes = mesh.points[mesh.edges[mesh.symmetry_edges]]
    along = nodes[:, 1] - nodes[:, 0]
    normal = np.column_stack([-along[:, 1], along[:, 0]])
    # Least squares: the point nearest to all lines, and of one line the foot from the mean of its nodes.
    mean = nodes.mean(axis=(0, 1))
    offset = np.einsum("nd,nd->n", normal, nodes[:, 0] - mean)
    point = mean + np.linalg.lstsq(normal, offset, rcond=SAME_PLACE)[0]
    arms = nodes - point
    apart = np.abs(arms[:, :, 0] * arms[:, [1, 2, 0], 1] - arms[:, :, 1] * arms[:, [1, 2, 0], 0]).max(axis=1)
    stray = apart / np.linalg.norm(arms, axis=2).max(axis=1)
    if stray.max() > SAME_PLACE * np.ptp(mesh.points, axis=0).max():
        where = place(nodes[stray.argmax(), 2])
        raise SectionError(f"symmetry lines must be straight and run through one point; not so at {where}")
    return point
