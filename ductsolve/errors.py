"""Errors a user can cause, each carrying one clear line, and the warning the library raises."""

import math
from numbers import Real


class DuctsolveError(ValueError):
    """Root of every error ductsolve raises for input it cannot accept."""


class FluidError(DuctsolveError):
    """A flow curve or its parameters describe no fluid the solver can take."""


class SectionError(DuctsolveError):
    """A section's dimensions or mesh describe no usable flow area."""


class DutyError(DuctsolveError):
    """The duty (pressure gradient, flow rate, accuracy) is missing, contradictory or out of range."""


class CaseError(DuctsolveError):
    """A case file, a unit or an output folder cannot be used as given."""


class DuctsolveWarning(UserWarning):
    """Something the user should know about an answer that is still given."""


def is_finite_number(value: object) -> bool:
    """Whether a value is a plain real number, finite in double precision; True and False are not."""
    if isinstance(value, bool) or type(value).__name__ == "bool" or not isinstance(value, Real):
        return False
    try:
        return math.isfinite(value)
    except OverflowError:
        return False
