"""Which classical series belongs to which input of which gap, and a case's answer put together from them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Problem
from transient.trust.verification import plane, round
from transient.trust.verification.motion import Motion
from transient.trust.verification.unit_jump import StartUp

MODES = 400

SERIES: dict[tuple[str, int], Callable[[Problem, np.ndarray, int], StartUp]] = {
    ("plates", LOWER): plane.lower,
    ("plates", UPPER): plane.upper,
    ("plates", PRESSURE): plane.pressure,
    ("pipe", UPPER): round.bore,
    ("pipe", PRESSURE): round.pipe_pressure,
    ("axial annulus", LOWER): round.axial_inner,
    ("axial annulus", UPPER): round.axial_outer,
    ("axial annulus", PRESSURE): round.annulus_pressure,
    ("rotating annulus", LOWER): round.rotating_inner,
    ("rotating annulus", UPPER): round.rotating_outer,
    ("plates, shear-free below", UPPER): plane.free_lower,
    ("plates, slip on both", PRESSURE): plane.pressure_with_slip,
}


class Textbook:
    """The exact flow of a case by superposition; ``series`` names the gap in ``SERIES`` where its shape does not."""

    def __init__(
        self, problem: Problem, motions: dict[int, Motion], y: np.ndarray, modes: int = MODES, series: str = ""
    ):
        rest = problem.start == "rest"
        self.parts = [
            (SERIES[series or problem.shape, index](problem, y, modes), motion.from_rest() if rest else motion)
            for index, motion in motions.items()
        ]

    @property
    def source(self) -> str:
        """Where the series stand."""
        return "; ".join(dict.fromkeys(start.source for start, _ in self.parts))

    def at(self, t: np.ndarray) -> np.ndarray:
        """(n, Q) outputs at times ``t`` (n,), from the left at a jump."""
        return sum(start.answer(motion, t) for start, motion in self.parts)

    def known(self, t: np.ndarray) -> np.ndarray:
        """(n,) where the kept modes give all digits."""
        return np.logical_and.reduce([start.old_enough(motion, t) for start, motion in self.parts])

    def steady(self, last: float) -> np.ndarray:
        """(Q,) the steady outputs of the inputs' values at time ``last`` s."""
        end = np.array([last])
        return sum(motion.value(end)[0] * start.steady for start, motion in self.parts)
