"""Small cases for the tests of what is printed, written and drawn."""

from __future__ import annotations

import numpy as np

CASES = {
    "channel": """
title = "Slurry <channel> & sons"
[section]
shape = "rectangle"
width = "150 mm"
height = "80 mm"
[fluid]
law = "Herschel-Bulkley"
yield_stress = "6 Pa"
consistency = "0.9 Pa.s^n"
index = 0.55
density = "1450 kg/m^3"
[duty]
pressure_gradient = "600 Pa/m"
length = "25 m"
[report]
flow_rate = "m3/h"
""",
    "ring": """
title = "Ring"
[section]
shape = "annulus"
outer_diameter = "100 mm"
inner_diameter = "96 mm"
eccentricity = 0.3
[fluid]
law = "power law"
consistency = "2 Pa.s^n"
index = 0.5
[duty]
flow_rate = "2 L/min"
length = "1 m"
""",
    "slot": """
[section]
shape = "rectangle"
width = "1 mm"
height = "1000 mm"
[fluid]
law = "Newtonian"
viscosity = "1 Pa.s"
[duty]
pressure_gradient = "1 bar/m"
""",
    "stuck": """
[section]
shape = "rectangle"
width = "20 mm"
height = "10 mm"
[fluid]
law = "Bingham"
yield_stress = "50 Pa"
plastic_viscosity = "0.2 Pa.s"
density = "1000 kg/m^3"
[duty]
pressure_gradient = "0.1 bar/m"
length = "2 m"
""",
    "angle": """
[section]
shape = "file"
file = "angle.vtu"
unit = "mm"
[fluid]
law = "power law"
consistency = "1 Pa.s^n"
index = 0.6
[duty]
pressure_gradient = "3000 Pa/m"
accuracy = "5 %"
""",
    "fast": """
[section]
shape = "circle"
diameter = "20 mm"
[fluid]
law = "flow curve"
shear_rate = { unit = "1/s", values = [1, 3, 10] }
shear_stress = { unit = "Pa", values = [0.01, 0.03, 0.1] }
density = "1000 kg/m^3"
[duty]
pressure_gradient = "0.5 bar/m"
""",
}


def write_case(folder, name):
    """Write a case, and its mesh if it has one; give its path."""
    if name == "angle":
        write_angle(folder / "angle.vtu")
    path = folder / f"{name}.toml"
    path.write_text(CASES[name], encoding="utf-8")
    return path


def write_angle(path):
    """Mesh of an angle profile with its re-entrant corner at (5, 5) mm."""
    import meshio

    count = 5
    x, y = np.meshgrid(np.arange(count), np.arange(count), indexing="ij")
    points = np.column_stack([x.ravel(), y.ravel(), 0 * x.ravel()]) * 2.5
    corner = np.array([i * count + j for i in range(4) for j in range(4) if i < 2 or j < 2])
    triangles = np.vstack(
        [
            np.column_stack([corner, corner + count, corner + count + 1]),
            np.column_stack([corner, corner + count + 1, corner + 1]),
        ]
    )
    meshio.Mesh(points, [("triangle", triangles)]).write(path)
