"""How a flow shows itself in a notebook."""

import re
import subprocess
import sys

import pytest

import ductsolve


@pytest.fixture(scope="module")
def flow():
    fluid = ductsolve.Bingham(4.0, 0.1)
    return ductsolve.solve(ductsolve.annulus(0.1, 0.06, 0.4), fluid, flow_rate=1e-3)


def test_a_flow_shows_table_and_picture(flow):
    page = flow._repr_html_()
    cells = dict(re.findall(r'<th scope="row">([^<]*)</th><td[^>]*>([^<]*)</td>', page))
    assert cells["flow rate, given"] == "60 L/min"
    low, high = map(float, re.match(r"([\d.]+) Pa/m and ([\d.]+) Pa/m", cells["guaranteed between"]).groups())
    assert low <= flow.pressure_gradient_bracket[0] <= flow.pressure_gradient_bracket[1] <= high
    assert cells["outcome"] == flow.status.value
    assert cells["looks unyielded"].endswith("% of the area")
    assert 'src="data:image/png;base64,' in page and 'alt="Axial velocity' in page
    assert len(page) < 400_000


def test_a_flow_that_does_not_move():
    still = ductsolve.solve(
        ductsolve.rectangle(0.02, 0.01), ductsolve.Bingham(50.0, 0.1), pressure_gradient=1e4
    )
    assert "no flow, proved" in still._repr_html_()


def test_drawing_is_loaded_only_when_asked_for():
    code = (
        "import sys, ductsolve;"
        "flow = ductsolve.solve(ductsolve.circle(0.1), ductsolve.Newtonian(1.0), flow_rate=1e-4);"
        "assert hasattr(flow, '_repr_html_') and 'matplotlib' not in sys.modules"
    )
    subprocess.run([sys.executable, "-c", code], check=True)
