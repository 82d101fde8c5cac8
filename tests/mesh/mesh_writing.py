"""Mesh files for the tests of this folder, and how they are read there."""

import meshio
import numpy as np
import pytest

from ductsolve.errors import SectionError
from ductsolve.mesh.files import read_section

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
