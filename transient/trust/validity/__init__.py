"""Does the model apply?  One function per check: ``(problem, history) -> Check``, or None where it has nothing to say.

A new check is a function in a file here and one entry in ``VALIDITY``.
"""

from __future__ import annotations

from collections.abc import Callable

from transient.gap.problem import Problem
from transient.result.history import History
from transient.trust.check import Check
from transient.trust.validity.entrance import entrance_length
from transient.trust.validity.heating import viscous_heating
from transient.trust.validity.pressure_wave import pressure_wave
from transient.trust.validity.proportions import side_walls, thin_film, very_thin
from transient.trust.validity.reynolds import combined_reynolds, pressure_reynolds, wall_reynolds
from transient.trust.validity.stokes_layer import stokes_layer
from transient.trust.validity.taylor import taylor

VALIDITY: tuple[Callable[[Problem, History], Check | None], ...] = (
    wall_reynolds,
    pressure_reynolds,
    combined_reynolds,
    taylor,
    stokes_layer,
    entrance_length,
    pressure_wave,
    viscous_heating,
    thin_film,
    side_walls,
    very_thin,
)


def validity_checks(problem: Problem, history: History) -> list[Check]:
    """All checks that apply, in the order of the registry."""
    found = (check(problem, history) for check in VALIDITY)
    return [check for check in found if check is not None]
