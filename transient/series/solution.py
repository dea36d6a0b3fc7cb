"""The exact flow of one case: stresses, velocities and mean velocity at any instant, each with its own bound."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Problem
from transient.series.answers import Answer, mode_count, velocity_answer, wall_answer
from transient.series.coupled import ClosedSolution, solve_closed
from transient.series.gapshape import GapShape, SeriesError, shape_of
from transient.series.located import Located
from transient.series.modes import modes
from transient.series.timeline import States, Timeline, evaluate, states, timeline
from transient.series.uniform import UniformFlow

# Share of the sum of magnitudes of an answer's terms that its error stays below: contour, cut of the modes, round-off.
TRUST = 3e-13
ROUNDING = 2e-16
FAINT = 0.3
HAIR = 3e-5


@dataclass(frozen=True, eq=False)
class Solution(Located):
    """An exact solution.  Instants are (piece, offset s) arrays (n,); its pieces begin at ``starts`` (P,) s.

    (p, 0) is the limit from the right at break p, (p, length of p) that from the left at the next.
    ``lead``: pieces before t = 0, which the callers' numbering does not see.
    """

    problem: Problem
    shape: GapShape
    line: Timeline
    at: States
    window: float
    starts: np.ndarray
    lead: int = 0

    def stress_and_mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 3) stresses on both walls, Pa, and mean velocity, m/s, in one go, and their bounds (n, 3)."""
        value, bound = self._evaluate(wall_answer(self.shape, self.window, 0), piece, offset)
        scale = np.array([self._stress_scale, self._stress_scale, self.problem.gap if self.problem.rotating else 1.0])
        return value * scale, bound * scale

    def stress(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) stress on the lower and upper wall, Pa, and its bound (n, 2); infinite at a jump of a no-slip wall."""
        value, bound = self._evaluate(wall_answer(self.shape, self.window, 0), piece, offset)
        scale = self._stress_scale
        return value[:, :2] * scale, bound[:, :2] * scale

    def stress_rate(self, piece: np.ndarray, offset: np.ndarray) -> np.ndarray:
        """(n, 2) time derivative of the stresses, Pa/s, from the right; meant for offsets > 0."""
        value, _ = self._evaluate(wall_answer(self.shape, self.window, 1), piece, offset)
        return value[:, :2] * self._stress_scale / self.problem.diffusion_time

    def mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) mean velocity, m/s, and its bound: section average, or tangential speed over the radius."""
        value, bound = self._evaluate(wall_answer(self.shape, self.window, 0), piece, offset)
        scale = self.problem.gap if self.problem.rotating else 1.0
        return value[:, 2] * scale, bound[:, 2] * scale

    def velocity(self, piece: np.ndarray, offset: np.ndarray, r: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, k) velocity (rotating gaps: angular) at coordinates ``r`` (k,) m, and its bound over the gap (n,)."""
        y = np.clip((np.asarray(r, dtype=float) - self.problem.inner) / self.problem.gap, 0.0, 1.0)
        value, bound = self._evaluate(velocity_answer(self.shape, self.window, y), piece, offset)
        # Far from the walls an early answer is smaller than any contour resolves: what is left is of this size.
        speeds = max(np.abs(self.at.left).max(), np.abs(self.at.jump).max())
        return value, bound.max(axis=1, initial=0.0) + TRUST * FAINT * speeds

    def inputs(self, piece: np.ndarray, offset: np.ndarray) -> np.ndarray:
        """(n, 3) lower speed, upper speed, pressure drop per length, Pa/m."""
        p, x = self._instants(piece, offset)
        power = x[:, None] ** np.arange(4.0)
        value = (self.line.poly[p] * power[:, None, :]).sum(axis=2)
        value += (self.line.coeff[p] * np.exp(self.line.exponent[p] * x[:, None, None])).real.sum(axis=2)
        return value * [1.0, 1.0, self.problem.viscosity / self.problem.gap**2]

    @property
    def _stress_scale(self) -> float:
        return self.problem.viscosity / (1.0 if self.problem.rotating else self.problem.gap)

    def _instants(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        p = np.atleast_1d(np.asarray(piece, dtype=np.int64)) + self.lead
        return p, np.atleast_1d(np.asarray(offset, dtype=float)) / self.problem.diffusion_time

    def _evaluate(self, answer: Answer, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        value, size = evaluate(self.line, self.at, answer, *self._instants(piece, offset))
        # Round-off in a nearly closed annulus grows with radius over gap, even in stating the gap itself; around a
        # hair-thin inner cylinder with the curvature.
        a = self.shape.a
        trust = TRUST * (1 + (HAIR / a if a > 0 else 0.0)) + ROUNDING * a + 20 * answer.modes.doubt
        return value, trust * (size + 1e-10 * size.max(axis=1, keepdims=True))


def solve(problem: Problem, until: float, tolerance: float = 1e-9) -> Solution | UniformFlow | ClosedSolution:
    """The exact flow on [0, until).  Raises SeriesError where the case has no series solution.

    ``tolerance`` is what the caller needs, relative to the largest terms; below 1e-12 it is refused.
    """
    if tolerance < 1e-12:
        raise SeriesError(f"the series is summed in double precision; a tolerance of {tolerance:g} is out of its reach")
    if problem.closed:
        return solve_closed(problem, until)
    shape = shape_of(problem)
    inputs = problem.inputs(until)
    if shape.unrestrained:
        return UniformFlow.of(problem, inputs)
    line = timeline(inputs, problem)
    window = line.window()
    return Solution(problem, shape, line, states(line, modes(shape, mode_count(window))), window, inputs.starts)
