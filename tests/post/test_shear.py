"""Stress inside the section."""

import numpy as np
import pytest

import ductsolve
from ductsolve.post.shear import nodal_shear_stress

GRADIENT = 2000.0


@pytest.fixture(scope="module")
def tube():
    fluid = ductsolve.HerschelBulkley(1.0, 2.0, 0.7)
    return ductsolve.solve(ductsolve.circle(0.1), fluid, pressure_gradient=GRADIENT, accuracy=1e-3)


def test_stress_in_a_tube_rises_with_the_radius(tube):
    radius = np.linalg.norm(tube.mesh.points, axis=1)
    assert nodal_shear_stress(tube) == pytest.approx(GRADIENT * radius / 2, abs=2e-3 * GRADIENT * 0.05)


def test_stress_vanishes_where_symmetry_has_it_vanish():
    flow = ductsolve.solve(ductsolve.rectangle(0.1, 0.02), ductsolve.PowerLaw(1.0, 0.4), flow_rate=1e-4)
    centre = np.linalg.norm(flow.mesh.points, axis=1).argmin()
    assert nodal_shear_stress(flow)[centre] == pytest.approx(0, abs=1e-12)
