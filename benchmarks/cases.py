"""Problems the benchmarks are run on: invented, of everyday size."""

from __future__ import annotations

import math
from dataclasses import dataclass

import ductsolve
from ductsolve import Section
from ductsolve.rheology.fluid import Fluid


@dataclass(frozen=True, eq=False)
class Problem:
    """A section, a fluid and a pressure gradient.

    Attributes
    ----------
    gradient : pressure gradient [Pa/m]
    corner : re-entrant corner (x, y) [m], if there is one
    """

    name: str
    section: Section
    fluid: Fluid
    gradient: float
    corner: tuple[float, float] | None = None

    def solve(self, accuracy: float, **options) -> ductsolve.DuctFlow:
        return ductsolve.solve(
            self.section, self.fluid, pressure_gradient=self.gradient, accuracy=accuracy, **options
        )


SQUARE = ductsolve.rectangle(0.01, 0.01)
# The least gradient that moves a fluid of unit yield stress through the square (Mosolov & Miasnikov 1965).
SQUARE_LIMIT = (2 + math.sqrt(math.pi)) / 0.01

SQUARE_THIN = Problem("square, n = 0.5", SQUARE, ductsolve.PowerLaw(1.0, 0.5), 1000.0)
SLOT = Problem("slot 1000:1, n = 0.5", ductsolve.rectangle(1.0, 0.001), ductsolve.PowerLaw(1.0, 0.5), 1e4)
NARROW_ANNULUS = Problem(
    "annulus, ratio 0.99, n = 0.5", ductsolve.annulus(0.2, 0.198), ductsolve.PowerLaw(1.0, 0.5), 1e4
)
SQUARE_NEAR_LIMIT = Problem(
    "square, Bingham, 0.8 of limit", SQUARE, ductsolve.Bingham(1.0, 0.1), SQUARE_LIMIT / 0.8
)


def drilling_annulus() -> Problem:
    """Eccentric annulus, Herschel-Bulkley fluid at three times the gradient that starts it."""
    section = ductsolve.annulus(0.2, 0.12, 0.5)
    start = ductsolve.start_up_gradient(section, 5.0, accuracy=0.01).estimate
    fluid = ductsolve.HerschelBulkley(5.0, 0.5, 0.6)
    return Problem("eccentric annulus, HB, 1/3 of limit", section, fluid, 3 * start)


def all_problems() -> list[Problem]:
    """The problems of the accuracy table."""
    thin = ductsolve.PowerLaw(1.0, 0.5)
    l_profile = [(0, 0), (0.02, 0), (0.02, 0.01), (0.01, 0.01), (0.01, 0.02), (0, 0.02)]
    return [
        SQUARE_THIN,
        Problem("square, n = 0.1", SQUARE, ductsolve.PowerLaw(1.0, 0.1), 1000.0),
        Problem("square, n = 2", SQUARE, ductsolve.PowerLaw(1.0, 2.0), 1000.0),
        Problem("rectangle 10:1, n = 0.5", ductsolve.rectangle(0.1, 0.01), thin, 1000.0),
        SLOT,
        Problem(
            "circle, Carreau n = 0.5",
            ductsolve.circle(0.01),
            ductsolve.CarreauYasuda(1.0, 0.001, 1.0, 0.5),
            4000.0,
        ),
        Problem("ellipse 2:1, Casson", ductsolve.ellipse(0.02, 0.01), ductsolve.Casson(1.0, 0.01), 1500.0),
        Problem(
            "annulus, ratio 0.5, HB n = 0.5",
            ductsolve.annulus(0.2, 0.1),
            ductsolve.HerschelBulkley(2.0, 0.5, 0.5),
            400.0,
        ),
        NARROW_ANNULUS,
        Problem(
            "eccentric annulus, Newtonian", ductsolve.annulus(0.2, 0.1, 0.6), ductsolve.Newtonian(1.0), 1000.0
        ),
        drilling_annulus(),
        Problem(
            "L-profile, n = 0.4",
            ductsolve.polygon(l_profile),
            ductsolve.PowerLaw(1.0, 0.4),
            1000.0,
            corner=(0.01, 0.01),
        ),
        Problem("square, Bingham, 0.38 of limit", SQUARE, ductsolve.Bingham(1.0, 0.1), SQUARE_LIMIT / 0.38),
        SQUARE_NEAR_LIMIT,
    ]
