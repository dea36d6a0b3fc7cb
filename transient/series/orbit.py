"""The periodic end of bodies and prescribed flow, and a flow's deviation from it.

The orbit is what the drive's cycles since for ever add up to.  The last few before t = 0 are answered like any other
pieces; all older ones at once, by the geometric sum of their transforms on one contour: its pole at s = 0,
which the contour encloses, is what a constant for ever would leave, and is taken off; the other poles of the sum lie
far outside.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from transient.gap.problem import Inputs, Problem
from transient.series.closing import Closing
from transient.series.coupled import FIELD, ClosedAnswer, ClosedSolution, Gap, Made, velocities_of, walls_of
from transient.series.gapshape import GapShape, SeriesError, shape_of
from transient.series.located import Located
from transient.series.oscillation import cycle_transform, swings
from transient.series.steady import steady_flow
from transient.series.timeline import Timeline, scaled, states
from transient.series.transfer import NODE, WEIGHT

# Whole cycles before t = 0 that are answered piece by piece: the sum's other poles then are 25 and more nodes' units
# away from the contour.
LEAD = 8
TRUST = 3e-13
ROUNDING = 2e-15
NEAR = 1e-12  # of a time: breaks are the same within this


def speeds_of(s: np.ndarray, unknown: np.ndarray, walls: np.ndarray) -> np.ndarray:
    """Speeds of both walls."""
    return unknown[:, :, :2]


@dataclass(frozen=True, eq=False)
class Orbit(Located):
    """The periodic end on [0, one period): instants are (piece of the cycle, offset s).

    ``recent`` answers the last ``LEAD`` cycles before t = 0 and the present one; ``transform`` (NODES, 3) is that of a
    cycle over its geometric sum on the contour of all older ones, ``average`` (3,) the cycle's own; ``swing`` (P, 3)
    what the older cycles have left in the oscillating modes; ``calm`` (3, 3) the steady state of each unit input.
    ``waves``: the cycle, where it is nothing but a constant and waves; then its answer is, too.
    """

    recent: ClosedSolution
    starts: np.ndarray
    period: float
    transform: np.ndarray
    average: np.ndarray
    swing: np.ndarray
    calm: np.ndarray
    waves: Timeline | None = None
    contours: dict[str, np.ndarray] = field(default_factory=dict)

    @property
    def shape(self) -> GapShape:
        """The dimensionless gap."""
        return self.recent.shape

    def stress_and_mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 3) stresses on both walls, Pa, and mean velocity, m/s, and their bounds (n, 3)."""
        steady = steady_flow(self.shape)
        calm = np.concatenate([steady.stress(), steady.mean()[:, None]], axis=1)
        value, bound = self._evaluate("walls", walls_of, calm, piece, offset)
        scale = self.recent.wall_scale
        return value * scale, bound * scale

    def stress(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) stress on the lower and upper wall, Pa, and its bound (n, 2)."""
        value, bound = self.stress_and_mean(piece, offset)
        return value[:, :2], bound[:, :2]

    def mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) mean velocity, m/s, and its bound."""
        value, bound = self.stress_and_mean(piece, offset)
        return value[:, 2], bound[:, 2]

    def speeds(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) both walls' speeds and their bounds."""
        return self._evaluate("speeds", speeds_of, np.eye(3)[:, :2], piece, offset)

    def velocity(self, piece: np.ndarray, offset: np.ndarray, r: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, k) velocity (rotating gaps: angular) at coordinates ``r`` (k,) m, and its bound over the gap (n,)."""
        problem = self.recent.problem
        y = np.clip((np.asarray(r, dtype=float) - problem.inner) / problem.gap, 0.0, 1.0)
        calm = steady_flow(self.shape).velocity(y)
        name = f"{FIELD} {hash(y.tobytes())}"
        value, bound = self._evaluate(name, velocities_of(self.shape, y), calm, piece, offset)
        return value, bound.max(axis=1, initial=0.0)

    def _evaluate(
        self, name: str, made: Made, calm: np.ndarray, piece: np.ndarray, offset: np.ndarray
    ) -> tuple[np.ndarray, np.ndarray]:
        recent = self.recent
        answer = recent.answer(name, made)
        piece, offset = np.atleast_1d(np.asarray(piece, dtype=np.int64)), np.atleast_1d(np.asarray(offset, dtype=float))
        if self.waves is not None:
            return self._waving(answer, calm, offset)
        value, bound = recent.evaluate(answer, piece + LEAD * len(self.starts), offset)
        time = recent.problem.diffusion_time
        period = self.period / time
        age = LEAD * period + (self.starts[piece] + offset) / time
        scale = LEAD * period
        if name not in self.contours:
            if name.startswith(FIELD):
                self.contours.clear()
            self.contours[name] = answer.transfer(NODE / scale)
        summed = np.einsum("ni,niq->nq", self.transform, self.contours[name])
        turn = np.exp(np.outer(age, NODE / scale)) * (WEIGHT / scale)
        pole = recent.gap.swing.pole
        still = self.calm @ calm + 2.0 * np.einsum("m,miq->iq", 1.0 / pole, answer.share).real
        value = value + (turn @ summed).imag + self.average @ still
        size = np.abs(turn) @ np.abs(summed) + np.abs(self.average) @ np.abs(still)
        left = np.exp(np.outer(age, pole))
        value = value + 2.0 * np.einsum("nm,mi,miq->nq", left, self.swing, answer.share).real
        size = size + 2.0 * np.einsum("nm,mi,miq->nq", np.abs(left), np.abs(self.swing), np.abs(answer.share))
        return value, bound + TRUST * size

    def _waving(self, answer: ClosedAnswer, calm: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """The answer to a constant and waves: each times the transfer function at its own rate."""
        assert self.waves is not None
        rate, coeff = self.waves.exponent[0], self.waves.coeff[0]
        used = np.flatnonzero(coeff.any(axis=0))
        constant = self.waves.poly[0, :, 0] @ (self.calm @ calm)
        value, size = np.tile(constant, (len(offset), 1)), np.tile(np.abs(constant), (len(offset), 1))
        x = offset / self.recent.problem.diffusion_time
        for k in used:
            for i in np.flatnonzero(coeff[:, k]):
                unknown, walls, grown = self.recent.gap.closing.unknowns(rate[i, k : k + 1])
                whole = coeff[i, k] * answer.made(rate[i, k : k + 1], unknown, walls)[0, i]
                value = value + (np.exp(rate[i, k] * x)[:, None] * whole).real
                size = size + np.abs(whole) * (1.0 + grown[0] * ROUNDING / TRUST)
        return value, TRUST * size


@dataclass(frozen=True, eq=False)
class ClosedDeviation(Located):
    """``flow`` less ``orbit``; instants are (piece, offset s) of the pieces that begin at ``starts`` (P,) s."""

    flow: ClosedSolution
    orbit: Orbit
    starts: np.ndarray

    @property
    def shape(self) -> GapShape:
        """The dimensionless gap."""
        return self.flow.shape

    def stress_and_mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 3) stresses on both walls, Pa, and mean velocity, m/s, and their bounds (n, 3)."""
        now, then = self._instants(piece, offset)
        return _less(self.flow.stress_and_mean(*now), self.orbit.stress_and_mean(*then))

    def stress(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) stress on the lower and upper wall, Pa, and its bound (n, 2)."""
        value, bound = self.stress_and_mean(piece, offset)
        return value[:, :2], bound[:, :2]

    def mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) mean velocity, m/s, and its bound."""
        value, bound = self.stress_and_mean(piece, offset)
        return value[:, 2], bound[:, 2]

    def speeds(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) both walls' speeds and their bounds."""
        now, then = self._instants(piece, offset)
        return _less(self.flow.speeds(*now), self.orbit.speeds(*then))

    def velocity(self, piece: np.ndarray, offset: np.ndarray, r: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, k) velocity (rotating gaps: angular) at coordinates ``r`` (k,) m, and its bound over the gap (n,)."""
        now, then = self._instants(piece, offset)
        return _less(self.flow.velocity(*now, r), self.orbit.velocity(*then, r))

    def _instants(self, piece: np.ndarray, offset: np.ndarray):  # type: ignore[no-untyped-def]
        """The instants in the flow's pieces and in the orbit's, on the same side of every break."""
        begin = self.starts[np.atleast_1d(piece)]
        offset = np.atleast_1d(np.asarray(offset, dtype=float))
        cycle, every = self.orbit.starts, self.orbit.period
        near = NEAR * np.maximum(begin + offset, every)
        own = np.clip(np.searchsorted(self.flow.starts, begin + near, side="right") - 1, 0, None)
        now = own, np.maximum(begin - self.flow.starts[own], 0.0) + offset
        local = begin - np.floor((begin + near) / every) * every
        place = np.clip(np.searchsorted(cycle, local + near, side="right") - 1, 0, None)
        passed = np.maximum(local - cycle[place], 0.0) + offset
        # a piece of the deviation may go on through several of the orbit, where those meet without a break
        beyond = passed > np.append(cycle[1:], every)[place] - cycle[place] + near
        late = (local + offset)[beyond]
        late = late - np.ceil((late - near[beyond]) / every - 1.0) * every
        place[beyond] = np.clip(np.searchsorted(cycle, late - near[beyond], side="left") - 1, 0, None)
        passed[beyond] = np.maximum(late - cycle[place[beyond]], 0.0)
        return now, (place, passed)


def _less(one: tuple[np.ndarray, np.ndarray], other: tuple[np.ndarray, np.ndarray]) -> tuple[np.ndarray, np.ndarray]:
    with np.errstate(invalid="ignore"):  # where both begin with an infinite stress
        return one[0] - other[0], one[1] + other[1]


def closed_orbit(problem: Problem, cycle: Inputs, period: float) -> Orbit:
    """The periodic end of a linear problem whose drives end in ``cycle`` over and over, every ``period`` s.

    Raises ``SeriesError`` where there is none.
    """
    shape = shape_of(problem)
    closing = Closing.of(problem, shape)
    still = [closing.settled(unit, {}) for unit in np.eye(3)]
    if any(unit is None for unit in still):
        raise SeriesError("nothing holds a body back: there is no periodic end")
    time = problem.diffusion_time
    whole = Inputs(
        (np.arange(LEAD + 1)[:, None] * period + cycle.starts).ravel(),
        np.tile(cycle.poly, (LEAD + 1, 1, 1)), np.tile(cycle.coeff, (LEAD + 1, 1, 1)),
        np.tile(cycle.rate, (LEAD + 1, 1, 1)), np.zeros(3),
    )  # fmt: skip
    line = scaled(whole, time, 1.0 / closing.unit)
    swing = swings(closing)
    changing = cycle.poly.any(axis=(0, 2)) | cycle.coeff.any(axis=(0, 2))
    gap = Gap(shape, closing, swing, 1.01 * (LEAD + 1) * period / time, changing)
    recent = ClosedSolution(
        problem, gap, line, states(line, gap.no_modes), np.zeros(3), np.zeros(2), np.zeros(3), whole.starts
    )
    once = scaled(cycle, time, 1.0 / closing.unit)
    length = period / time
    s = NODE / (LEAD * length)
    transform = cycle_transform(once, length, s) / -np.expm1(s * length)[:, None]
    average = cycle_transform(once, length, np.zeros(1, complex))[0].real / length
    left = cycle_transform(once, length, swing.pole) / -np.expm1(swing.pole * length)[:, None]
    plain = len(cycle.starts) == 1 and not cycle.poly[0, :, 1:].any() and not cycle.rate[0].real.any()
    return Orbit(
        recent, cycle.starts, period, transform, average, left, np.array(still), once if plain else None
    )
