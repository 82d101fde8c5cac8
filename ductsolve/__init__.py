"""ductsolve: laminar flow of non-Newtonian fluids in ducts of any section, every answer with its bracket.

Public names load on first use, so that importing the package costs nothing.
"""

import importlib

__version__ = "0.1.0"

_HOMES = {
    "ductsolve.errors": [
        "CaseError",
        "DuctsolveError",
        "DuctsolveWarning",
        "DutyError",
        "FluidError",
        "SectionError",
    ],
    "ductsolve.rheology.laws": [
        "Bingham",
        "CarreauYasuda",
        "Casson",
        "Cross",
        "Ellis",
        "HerschelBulkley",
        "Newtonian",
        "PowerLaw",
        "RobertsonStiff",
        "Sisko",
    ],
    "ductsolve.rheology.tabulated": ["FlowCurve"],
    "ductsolve.mesh.sections": ["Section", "annulus", "circle", "ellipse", "rectangle"],
    "ductsolve.mesh.outline": ["polygon"],
    "ductsolve.mesh.files": ["read_section"],
    "ductsolve.solver.flow": ["DuctFlow", "Status"],
    "ductsolve.solver.solve": ["solve"],
    "ductsolve.solver.startup": ["start_up_gradient"],
    "ductsolve.app.case": ["read_case"],
}
_HOME = {name: home for home, names in _HOMES.items() for name in names}

__all__ = sorted(_HOME)


def __getattr__(name):
    if name not in _HOME:
        raise AttributeError(f"module 'ductsolve' has no attribute {name!r}")
    value = getattr(importlib.import_module(_HOME[name]), name)
    globals()[name] = value
    if name in ("DuctFlow", "solve"):
        importlib.import_module("ductsolve.solver.flow").DuctFlow._repr_html_ = _show_in_notebook
    return value


def _show_in_notebook(flow):
    """The flow as a table with its picture; drawing is loaded only when a notebook asks for it."""
    return importlib.import_module("ductsolve.app.notebook").html(flow)


def __dir__():
    return sorted({*globals(), *__all__})
