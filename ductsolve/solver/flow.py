"""The answer: a duct flow with its bracket."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import Enum
from functools import cached_property

import numpy as np

from ductsolve.mesh.sections import Section
from ductsolve.mesh.triangles import Mesh
from ductsolve.rheology.fluid import Fluid
from ductsolve.solver.fields import Level
from ductsolve.solver.peak import largest_value
from ductsolve.solver.plug import SLOW, Plug, plug
from ductsolve.solver.wall import WallShear, wall_shear
from ductsolve.solver.whole import Whole

Bracket = tuple[float, float]


class Status(Enum):
    """How an answer ended; the text says what to make of it."""

    ANSWERED = "answered to the accuracy asked"
    NO_FLOW = "no flow, proved"
    BUDGET = "bracket true but wider than asked: the triangle budget is used up; allow more triangles"
    UNDECIDED = "flow or no flow not decided: the gradient is too near the start-up gradient"


@dataclass(frozen=True)
class LevelRecord:
    """What one level of refinement did.

    Attributes
    ----------
    triangles : in the part that is solved
    stress_steps, velocity_steps : linear systems solved
    gap : relative width of the bracket on the potential
    half_width : relative half-width of the bracket on the answer, or None where it was not worked out
    """

    triangles: int
    stress_steps: int
    velocity_steps: int
    gap: float
    half_width: float | None


@dataclass(frozen=True, eq=False)
class DuctFlow:
    """Fully developed laminar flow through a section; SI units throughout.

    Attributes
    ----------
    section, fluid : what was solved
    pressure_gradient : driving gradient -dp/dz [Pa/m], given or best estimate
    flow_rate : volume flow rate [m3/s], given or best estimate
    pressure_gradient_bracket, flow_rate_bracket : guaranteed (low, high); the given one twice
    estimated_error : relative, of the best estimate; not guaranteed, usually far below the bracket
    accuracy : relative half-width that was asked of the bracket
    status : how it ended
    history : one record a level
    level, psi, velocity_field : mesh of the part that is solved, and on it the stress function per unit
        gradient and the velocity at each triangle's nodes, (n_triangles, 6) [m2], [m/s]
    solved_gradient : pressure gradient they were relaxed at [Pa/m]
    gap : width of the bracket on the potential of that part [W/m]
    """

    section: Section
    fluid: Fluid
    pressure_gradient: float
    flow_rate: float
    pressure_gradient_bracket: Bracket
    flow_rate_bracket: Bracket
    estimated_error: float
    accuracy: float
    status: Status
    history: tuple[LevelRecord, ...] = field(repr=False)
    level: Level = field(repr=False)
    psi: np.ndarray = field(repr=False)
    velocity_field: np.ndarray = field(repr=False)
    solved_gradient: float = field(repr=False)
    gap: float = field(repr=False)

    @property
    def mean_velocity(self) -> float:
        """Flow rate over area [m/s]."""
        return self.flow_rate / self.section.area

    @cached_property
    def max_velocity(self) -> float:
        """Largest velocity anywhere [m/s]."""
        return largest_value(self.velocity_field)

    @cached_property
    def whole(self) -> Whole:
        """The whole section, put together from copies of the part that is solved."""
        return Whole(self.section, self.level)

    @property
    def mesh(self) -> Mesh:
        """Mesh of the whole section."""
        return self.whole.mesh

    @cached_property
    def velocity(self) -> np.ndarray:
        """Axial velocity (n_points,) at the points of ``mesh`` [m/s]."""
        return self.whole.nodal(self.velocity_field)

    @cached_property
    def wall_shear(self) -> WallShear:
        """Shear stress along every wall of the whole section [Pa]."""
        return wall_shear(self.section, self.level, self.whole, self.psi, self.pressure_gradient)

    @cached_property
    def plug(self) -> Plug:
        """Unyielded parts of the area, proved and apparent."""
        slow = SLOW * 8 * self.mean_velocity / self.section.hydraulic_diameter
        return plug(self.level, self.fluid, self.solved_gradient, self.psi, self.gap, slow)

    @property
    def plug_fraction(self) -> float:
        """Fraction of the area that looks unyielded; ``plug.proved`` is what is certain."""
        return self.plug.apparent
