"""Flow through pipe and slit from each law's rate, against published and closed-form values.

Weissenberg-Rabinowitsch: Q/(pi R^3) = int_0^tau_w tau^2 rate dtau / tau_w^3 for a pipe of radius R, and
mean velocity / half gap = int_0^tau_w tau rate dtau / tau_w^2 for a slit. The files name their sources.
"""

import csv
from pathlib import Path

import pytest
from scipy.integrate import quad

from ductsolve.rheology.laws import (
    Bingham,
    CarreauYasuda,
    Casson,
    Cross,
    Ellis,
    HerschelBulkley,
    RobertsonStiff,
)

PUBLISHED = Path(__file__).parents[1] / "published"


def table(name):
    lines = [line for line in (PUBLISHED / name).read_text().splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


def flow(fluid, wall_stress, power):
    """Pipe (power 2) or slit (power 1), as in the heading."""

    def shear(stress):
        return float(fluid.rate(stress)) * (stress / wall_stress) ** power / wall_stress

    return quad(shear, fluid.yield_stress, wall_stress, epsabs=0.0, epsrel=1e-11, limit=200)[0]


REDUCED = {
    "carreau": lambda n: CarreauYasuda(1.0, 0.0, 1.0, n),
    "cross": lambda m: Cross(1.0, 0.0, 1.0, m),
    "ellis": lambda a: Ellis(1.0, 1.0, a),
    "robertson-stiff(A=C=1)": lambda b: RobertsonStiff(1.0, b, 1.0),
}


@pytest.mark.parametrize(
    "row", table("F2_GNF_pipe_slit_values.csv"), ids=lambda row: f"{row['model']}-{row['param']}-{row['tw']}"
)
def test_generalised_newtonian_pipe_and_slit(row):
    fluid, wall_stress = REDUCED[row["model"]](float(row["param"])), float(row["tw"])
    # Twelve digits are given.
    assert fluid.rate(wall_stress) == pytest.approx(float(row["gw"]), rel=1e-11)
    assert flow(fluid, wall_stress, 2) == pytest.approx(float(row["Ypipe"]), rel=1e-11)
    assert flow(fluid, wall_stress, 1) == pytest.approx(float(row["Yslit"]), rel=1e-11)


# Column of the file: power in ``flow``, fluid of a yield stress, and the flow it is divided by (tau_w = 1).
YIELDING = {
    "BR": (2, lambda phi: Bingham(phi, 1.0), 1.0 / 4.0),
    "BS": (1, lambda phi: Bingham(phi, 1.0), 1.0 / 3.0),
    "CP": (2, lambda phi: Casson(phi, 1.0), 1.0 / 4.0),
    "CS": (1, lambda phi: Casson(phi, 1.0), 1.0 / 3.0),
    "HBpipe_0.5": (2, lambda phi: HerschelBulkley(phi, 1.0, 0.5), 1.0),
    "HBpipe_0.7": (2, lambda phi: HerschelBulkley(phi, 1.0, 0.7), 1.0),
    "HBpipe_0.8": (2, lambda phi: HerschelBulkley(phi, 1.0, 0.8), 1.0),
    "HBslit_0.5": (1, lambda phi: HerschelBulkley(phi, 1.0, 0.5), 1.0),
    "HBslit_0.7": (1, lambda phi: HerschelBulkley(phi, 1.0, 0.7), 1.0),
    "HBslit_0.8": (1, lambda phi: HerschelBulkley(phi, 1.0, 0.8), 1.0),
}


@pytest.mark.parametrize("column", YIELDING)
def test_yield_stress_pipe_and_slit(column):
    power, fluid, divisor = YIELDING[column]
    for row in table("C1_yield_pipe_slit.csv"):
        found = flow(fluid(float(row["phi"])), 1.0, power) / divisor
        # Fourteen digits are given, of numbers that fall to 3e-5.
        assert found == pytest.approx(float(row[column]), rel=1e-10, abs=1e-13)
