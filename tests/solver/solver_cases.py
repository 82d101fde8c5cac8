"""Sections and levels that several tests share."""

from __future__ import annotations

import numpy as np

from ductsolve.mesh.outline import polygon
from ductsolve.mesh.sections import annulus, circle, ellipse, rectangle
from ductsolve.solver.levels import first_level, refine, relax

L_CORNERS = [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)]
SQUARE_HOLE = [(0.8, 0.8), (1.2, 0.8), (1.2, 1.3), (0.8, 1.3)]
ROUND_HOLE = [(2.9 + 0.4 * np.cos(a), 1.1 + 0.4 * np.sin(a)) for a in np.linspace(0, 2 * np.pi, 13)[:-1]]

# A quarter, a sector, a half and wholes; straight and curved; re-entrant, with one hole and with two.
SECTIONS = {
    "square": rectangle(1.0, 1.0),
    "slot": rectangle(1.0, 0.001),
    "circle": circle(2.0),
    "ellipse": ellipse(3.0, 1.0),
    "concentric annulus": annulus(2.0, 1.0),
    "narrow annulus": annulus(2.0, 1.98),
    "eccentric annulus": annulus(2.0, 1.0, 0.6),
    "touching annulus": annulus(2.0, 0.4, 0.99),
    "triangle": polygon([(0, 0), (3, 0), (1, 2)]),
    "L": polygon(L_CORNERS),
    "one hole": polygon([(0, 0), (2, 0), (2, 2), (0, 2)], holes=[SQUARE_HOLE]),
    "two holes": polygon([(0, 0), (4, 0), (4, 2), (0, 2)], holes=[SQUARE_HOLE, ROUND_HOLE]),
}


def relaxed(section, fluid, gradient, levels=3, goal=1e-4):
    """Iterate after some levels of refinement where the gap is."""
    level, psi = first_level(section), None
    for remaining in range(levels, 0, -1):
        iterate = relax(level, fluid, gradient, psi, goal)
        if remaining > 1:
            level, psi = refine(iterate)
    return iterate
