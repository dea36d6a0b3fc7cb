"""The exact flow under bodies and prescribed flow, and the bodies' own motion, each value with its bound.

Every break of an input is answered on Laplace contours, however old: all poles but a few lie on the negative axis,
where the contours enclose them at any age.  The few are the oscillating modes of sprung bodies, taken out of the
transfer functions and followed by themselves.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
from functools import lru_cache

import numpy as np

from transient.gap.problem import Problem
from transient.series.closing import Closing
from transient.series.early import HALF, MIDDLE, TERMS, EarlyTable, early_table
from transient.series.evaluation import young_levels
from transient.series.gapshape import GapShape, SeriesError, shape_of
from transient.series.located import Located
from transient.series.modes import Modes
from transient.series.oscillation import Swings, amplitudes, swings
from transient.series.slow import velocity_response
from transient.series.steady import steady_flow
from transient.series.timeline import States, Timeline, evaluate, scaled, states
from transient.series.transfer import NODE

# Share of the sum of magnitudes of an answer's terms that its error stays below, as in ``solution``.
TRUST = 3e-13
ROUNDING = 2e-16
FAINT = 0.3
FLOOR = 1e-9  # of the largest quantity: far from what moves, answers are fainter than any contour resolves
HAIR = 3e-5
# Answers at the very instant of a jump: between these two the transfer functions show how they grow.
_FAR, _FARTHEST = 1e26, 1e30
_GROWS, _VANISHES = 0.3, -0.2
ROUND_OFFS = 8.0
TOGETHER = 16  # contours of velocities worked out at once: what they need stays small
FIELD = "velocity"
MOTIONS = (slice(0, 2), slice(2, 4), slice(4, 6), slice(6, 7))  # kinds of outputs of ``motion_of``


@dataclass(frozen=True, eq=False)
class Gap:
    """What all answers of a closed gap share: ``closing``, ``swing``, and the closing solved on contours' nodes.

    ``active`` (3,): the inputs that ever change.
    """

    shape: GapShape
    closing: Closing
    swing: Swings
    window: float
    active: np.ndarray
    solved: dict[int, tuple[np.ndarray, np.ndarray, float]] = field(default_factory=dict)

    @property
    def no_modes(self) -> Modes:
        """Modes that answer nothing: contours do it all."""
        none = np.empty(0)
        return Modes(self.shape, none, none, np.empty((0, 3)), np.empty((0, 2)), none, none, 0.0)

    def fetch(self, levels: np.ndarray) -> None:
        """Solve the closing on the contours of all ``levels`` that are not known yet, at once."""
        missing = [int(level) for level in levels if int(level) not in self.solved]
        if not missing:
            return
        s = NODE / np.ldexp(self.window, -1 - np.array(missing))[:, None]
        unknown, walls, grown = self.closing.unknowns(s.ravel())
        for k, level in enumerate(missing):
            part = slice(k * len(NODE), (k + 1) * len(NODE))
            self.solved[level] = unknown[part], walls[part], float(grown[part].max())

    def level(self, level: int) -> tuple[np.ndarray, np.ndarray, float]:
        """(unknowns, walls, growth of round-off) on the contour of a level."""
        self.fetch(np.array([level]))
        return self.solved[level]


# What an answer makes of the unknowns: (s, unknowns (S, 3, 3), walls (S, 3, 3)) to (S, 3, Q).
Made = Callable[[np.ndarray, np.ndarray, np.ndarray], np.ndarray]


def walls_of(s: np.ndarray, unknown: np.ndarray, walls: np.ndarray) -> np.ndarray:
    """Stresses on both walls and mean velocity."""
    return unknown @ walls


def motion_of(closing: Closing) -> Made:
    """Speeds of both walls, their rates, their travel, and the pressure drop.

    The rate of a body with a mass is what acts on it but its load, over the mass: the load's own share needs no contour
    (and in the answer to an impulse it would be all, for no time at all).
    """

    def made(s: np.ndarray, unknown: np.ndarray, walls: np.ndarray) -> np.ndarray:
        speed = unknown[:, :, :2]
        at = s[:, None, None]
        travel, rate = speed / at, at * speed
        acting = (unknown @ walls)[:, :, :2] + closing.face * unknown[:, :, 2:]
        acting = acting - closing.damping * speed - closing.stiffness * travel
        heavy = closing.mass > 0.0
        rate[:, :, heavy] = acting[:, :, heavy] / closing.mass[heavy]
        return np.concatenate([speed, rate, travel, unknown[:, :, 2:]], axis=2)

    return made


def velocities_of(shape: GapShape, y: np.ndarray) -> Made:
    """Velocities at ``y`` (k,)."""
    return lambda s, unknown, walls: unknown @ velocity_response(shape, s, y)


@dataclass(frozen=True, eq=False)
class ClosedAnswer:
    """Q outputs of a closed gap, as ``timeline.evaluate`` asks for them: no modes, contours for every age."""

    gap: Gap
    made: Made
    alike: tuple[slice, ...]
    share: np.ndarray
    sudden: np.ndarray
    modes: Modes
    weight: np.ndarray
    slow: np.ndarray
    contours: dict[int, np.ndarray] = field(default_factory=dict)
    tables: dict[tuple[int, int], EarlyTable] = field(default_factory=dict)

    @classmethod
    def of(cls, gap: Gap, made: Made, alike: tuple[slice, ...]) -> ClosedAnswer:
        """Prepare: the shares (P, 3, Q) of the oscillating modes, and what is felt at once.

        ``alike``: outputs of one kind each, whose sizes compare.
        """
        swing = gap.swing
        share = made(swing.pole, swing.residue, swing.walls)
        count = share.shape[2]
        weight, slow = np.empty((0, count)), np.zeros((4, 3, count))
        return cls(gap, made, alike, share, _at_once(gap, made, 0), gap.no_modes, weight, slow)

    @property
    def window(self) -> float:
        """Age up to which contours answer: all."""
        return self.gap.window

    def transfer(self, s: np.ndarray) -> np.ndarray:
        """(S, 3, Q) at complex ``s`` (S,), without the oscillating modes."""
        unknown, walls, _ = self.gap.closing.unknowns(s)
        return self._rest(s, self.made(s, unknown, walls))

    def fetch(self, levels: np.ndarray) -> None:
        """Transfer functions on the contours of all ``levels`` that are not known yet, some at once."""
        self.gap.fetch(levels)
        missing = [int(level) for level in levels if int(level) not in self.contours]
        for first in range(0, len(missing), TOGETHER):
            some = missing[first : first + TOGETHER]
            known = [self.gap.level(level) for level in some]
            unknown, walls = (np.concatenate([own[i] for own in known]) for i in (0, 1))
            s = (NODE / np.ldexp(self.gap.window, -1 - np.array(some))[:, None]).ravel()
            value = self._rest(s, self.made(s, unknown, walls)).reshape(len(some), len(NODE), 3, -1)
            self.contours.update(zip(some, value, strict=True))

    def contour(self, level: int) -> np.ndarray:
        """(NODES, 3, Q) on the contour for ages window/2^(level+1) .. window/2^level."""
        self.fetch(np.array([level]))
        return self.contours[level]

    def table(self, level: int, orders: int) -> EarlyTable:
        """Answers to a unit pulse and to unit jumps of value, slope ... at the level's ages; their reach covers what
        solving the closing costs in digits."""
        if (level, orders) not in self.tables:
            age = float(np.ldexp(self.gap.window, -1 - level))
            used = self.gap.active
            made = early_table(np.ascontiguousarray(self.contour(level)[:, used]), age, orders)
            count = self.weight.shape[1]
            series, reach = np.zeros((orders, 3, count, TERMS)), np.zeros((orders, 3, count))
            series[:, used] = made.series
            reach[:, used] = made.reach * (1.0 + ROUND_OFFS * ROUNDING * self.gap.level(level)[2] / TRUST)
            self.tables[level, orders] = EarlyTable(series, reach)
        return self.tables[level, orders]

    def steady_response(self, rates: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(nothing, (R, 3, Q) transfer functions at ``rates``): the second takes an exponential off the contours."""
        rest = np.zeros((len(rates), 3, self.weight.shape[1]), complex)
        whole = np.zeros_like(rest)
        ask = (rates.imag != 0.0) | (rates.real > 0.0)
        if ask.any():
            whole[ask] = self.transfer(rates[ask])
        return rest, whole

    def _rest(self, s: np.ndarray, value: np.ndarray) -> np.ndarray:
        for pole, share in zip(self.gap.swing.pole, self.share, strict=True):
            value = value - share / (s - pole)[:, None, None] - share.conj() / (s - pole.conjugate())[:, None, None]
        return value


def _at_once(gap: Gap, made: Made, order: int) -> np.ndarray:
    """(3, Q) answer at the very instant of a unit jump of each input's ``order``-th derivative (-1: a unit impulse)."""
    s = np.array([_FAR, _FARTHEST], complex)
    unknown, walls, _ = gap.closing.unknowns(s)
    near, far = made(s, unknown, walls).real * s.real[:, None, None] ** -order
    with np.errstate(divide="ignore", invalid="ignore"):
        growth = np.log(np.abs(far / near)) / np.log(_FARTHEST / _FAR)
        endless = np.sign(far) * np.inf
    growth = np.where(np.isfinite(growth), growth, _VANISHES)
    return np.where(growth > _GROWS, endless, np.where(growth <= _VANISHES, 0.0, far))


@dataclass(frozen=True, eq=False)
class ClosedSolution(Located):
    """An exact solution with bodies or prescribed flow; instants are (piece, offset s) arrays (n,), as in ``Solution``.

    ``base`` (3,) the steady state before t = 0 (speeds, pressure drop times gap^2 / viscosity); ``place`` (2,) of the
    bodies at t = 0; ``kick`` (3,) impulses that set bodies in motion at t = 0.
    """

    problem: Problem
    gap: Gap
    line: Timeline
    at: States
    base: np.ndarray
    place: np.ndarray
    kick: np.ndarray
    starts: np.ndarray
    answers: dict[str, ClosedAnswer] = field(default_factory=dict)

    @property
    def shape(self) -> GapShape:
        """The dimensionless gap."""
        return self.gap.shape

    def stress_and_mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 3) stresses on both walls, Pa, and mean velocity, m/s, and their bounds (n, 3)."""
        calm = np.zeros(3)
        if self.base.any():
            steady = steady_flow(self.shape)
            calm = self.base @ np.concatenate([steady.stress(), steady.mean()[:, None]], axis=1)
        value, bound = self.evaluate(self.answer("walls", walls_of), piece, offset, calm)
        return value * self.wall_scale, bound * self.wall_scale

    @property
    def wall_scale(self) -> np.ndarray:
        """(3,) what makes stresses, Pa, and a mean velocity, m/s, of the dimensionless ones."""
        rotating, gap = self.problem.rotating, self.problem.gap
        stress = self.problem.viscosity / (1.0 if rotating else gap)
        return np.array([stress, stress, gap if rotating else 1.0])

    def speeds(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) both walls' speeds and their bounds."""
        value, bound = self.motion(piece, offset)
        return value[:, :2], bound[:, :2]

    def stress(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) stress on the lower and upper wall, Pa, and its bound (n, 2)."""
        value, bound = self.stress_and_mean(piece, offset)
        return value[:, :2], bound[:, :2]

    def mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) mean velocity, m/s, and its bound."""
        value, bound = self.stress_and_mean(piece, offset)
        return value[:, 2], bound[:, 2]

    def motion(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 7) both walls' speeds, rates and places, and the pressure drop per length in SI, and their bounds.

        A place is a body's from its own zero; a prescribed wall's counts from t = 0.
        """
        calm = np.concatenate([self.base[:2], np.zeros(4), self.base[2:]])
        value, bound = self.evaluate(self.answer("motion", motion_of(self.gap.closing), MOTIONS), piece, offset, calm)
        heavy = np.flatnonzero(self.gap.closing.mass > 0.0)
        value[:, 2 + heavy] += self._loads(piece, offset)[:, heavy] / self.gap.closing.mass[heavy]
        time = self.problem.diffusion_time
        pressure = self.problem.viscosity / self.problem.gap**2
        scale = np.array([1.0, 1.0, 1.0 / time, 1.0 / time, time, time, pressure])
        value, bound = value * scale, bound * scale
        elapsed = self.starts[np.atleast_1d(piece)] + offset
        value[:, 4:6] += self.place + elapsed[:, None] * self.base[:2]
        bound[:, 4:6] += ROUNDING * np.abs(value[:, 4:6])
        return value, bound

    def _loads(self, piece: np.ndarray, offset: np.ndarray) -> np.ndarray:
        """(n, 3) inputs less those before t = 0, dimensionless."""
        p = np.atleast_1d(np.asarray(piece, dtype=np.int64))
        x = np.atleast_1d(np.asarray(offset, dtype=float)) / self.problem.diffusion_time
        value = (self.line.poly[p] * (x[:, None] ** np.arange(4.0))[:, None, :]).sum(axis=2)
        value += (self.line.coeff[p] * np.exp(self.line.exponent[p] * x[:, None, None])).real.sum(axis=2)
        return value - self.at.left[0]

    def velocity(self, piece: np.ndarray, offset: np.ndarray, r: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, k) velocity (rotating gaps: angular) at coordinates ``r`` (k,) m, and its bound over the gap (n,)."""
        y = np.clip((np.asarray(r, dtype=float) - self.problem.inner) / self.problem.gap, 0.0, 1.0)
        calm = self.base @ steady_flow(self.shape).velocity(y) if self.base.any() else np.zeros(len(y))
        answer = self.answer(f"{FIELD} {hash(y.tobytes())}", velocities_of(self.shape, y))
        value, bound = self.evaluate(answer, piece, offset, calm)
        return value, bound.max(axis=1, initial=0.0) * (1.0 + FAINT)

    def answer(self, name: str, made: Made, alike: tuple[slice, ...] = (slice(None),)) -> ClosedAnswer:
        """The answer of a ``name``, prepared once."""
        if name not in self.answers:
            if name.startswith(FIELD):  # tables over a whole gap weigh megabytes
                for other in [key for key in self.answers if key.startswith(FIELD)]:
                    del self.answers[other]
            self.answers[name] = ClosedAnswer.of(self.gap, made, alike)
        return self.answers[name]

    def evaluate(
        self, answer: ClosedAnswer, piece: np.ndarray, offset: np.ndarray, calm: np.ndarray | float = 0.0
    ) -> tuple[np.ndarray, np.ndarray]:
        """(n, Q) dimensionless values above a ``calm`` (Q,) from before, and their bounds."""
        p = np.atleast_1d(np.asarray(piece, dtype=np.int64))
        x = np.atleast_1d(np.asarray(offset, dtype=float)) / self.problem.diffusion_time
        # all breaks are young: what their ages need is worked out together
        none = np.full(len(p), -1)
        answer.fetch(np.unique(np.maximum(young_levels(self.line.starts, p, x, none, self.gap.window), 0)))
        value, size = evaluate(self.line, self.at, answer, p, x)  # type: ignore[arg-type]
        value += calm
        size += np.abs(calm)
        self._add_kick(answer, p, x, value, size)
        self._add_bends(answer, p, x, value)
        late = self._add_swings(answer, p, x, value, size)
        a = self.shape.a
        trust = TRUST * (1 + (HAIR / a if a > 0 else 0.0)) + ROUNDING * a
        for alike in answer.alike:
            size[:, alike] += FLOOR * size[:, alike].max(axis=1, keepdims=True)
        return value, trust * size + late

    def _add_kick(
        self, answer: ClosedAnswer, p: np.ndarray, x: np.ndarray, value: np.ndarray, size: np.ndarray
    ) -> None:
        """Add the answer to the impulses at t = 0."""
        if not self.kick.any():
            return
        age = self.line.starts[p] + x
        first = age <= self.gap.window * 1e-36
        if first.any():
            # the oscillating modes are added apart, at this instant too
            limit = _at_once(self.gap, answer.made, -1) - 2.0 * answer.share.real.sum(axis=0)
            for i in np.flatnonzero(self.kick):
                felt = limit[i] != 0.0
                with np.errstate(invalid="ignore"):  # two bodies set going, each an infinite stress of its own sign
                    value[np.ix_(first, felt)] += self.kick[i] * limit[i, felt]
        level = np.floor(np.log2(self.gap.window / np.where(first, self.gap.window, age))).astype(int)
        level = np.maximum(level + (age < np.ldexp(self.gap.window, -1 - level)), 0)
        for number in np.unique(level[~first]):
            here = (level == number) & ~first
            table = answer.table(int(number), self.line.orders)
            turn = _turns(age[here], float(np.ldexp(self.gap.window, -1 - number)))
            for i in np.flatnonzero(self.kick):
                value[here] += self.kick[i] * (turn @ table.series[0, i].T)
                size[here] += abs(self.kick[i]) * table.reach[0, i]

    def _add_bends(self, answer: ClosedAnswer, p: np.ndarray, x: np.ndarray, value: np.ndarray) -> None:
        """Add, at breaks themselves, what a jump of an input's slope is answered by at once (a pressure, say)."""
        at = np.flatnonzero(x == 0.0)
        if len(at) == 0:
            return
        felt = _at_once(self.gap, answer.made, 1)
        if not felt.any():
            return
        slope = _slopes(self.line)
        for i in range(3):
            for q in np.flatnonzero(felt[i]):
                value[at, q] += np.where(slope[p[at], i] != 0.0, felt[i, q], 0.0) * slope[p[at], i]

    def _add_swings(
        self, answer: ClosedAnswer, p: np.ndarray, x: np.ndarray, value: np.ndarray, size: np.ndarray
    ) -> np.ndarray | float:
        """Add the oscillating modes; what the round-off of their poles makes late in the run (n, Q) is returned."""
        swing = self.gap.swing
        if len(swing.pole) == 0:
            return 0.0
        amount, reach = amplitudes(swing, self.line, self.at.left[0], self.kick, p, x)
        value += 2.0 * np.einsum("nmi,miq->nq", amount, answer.share).real
        weight = 2.0 * np.abs(answer.share)
        size += np.einsum("nmi,miq->nq", reach, weight)
        drift = ROUND_OFFS * ROUNDING * np.abs(swing.pole) * (self.line.starts[p] + x)[:, None]
        return np.einsum("nmi,nm,miq->nq", np.abs(amount), drift, weight)


def _turns(age: np.ndarray, smallest: float) -> np.ndarray:
    """(n, TERMS) Chebyshev polynomials at the ages' places in the octave that begins at ``smallest``."""
    place = np.clip((age / smallest - MIDDLE) / HALF, -1.0, 1.0)
    return np.cos(np.arange(TERMS) * np.arccos(place)[:, None])


def _slopes(line: Timeline) -> np.ndarray:
    """(P, 3) jumps of the inputs' slopes at every break, from nothing before the first."""
    lengths = np.append(line.lengths, 0.0)[:, None]
    begin = line.poly[:, :, 1] + (line.coeff * line.exponent).real.sum(axis=2)
    end = line.poly[:, :, 1] + lengths * (2.0 * line.poly[:, :, 2] + lengths * 3.0 * line.poly[:, :, 3])
    end = end + (line.coeff * line.exponent * np.exp(line.exponent * lengths[:, :, None])).real.sum(axis=2)
    out = begin.copy()
    out[1:] -= end[:-1]
    size = np.abs(begin)
    size[1:] += np.abs(end[:-1])
    return np.where(np.abs(out) > 1e-11 * size, out, 0.0)


@lru_cache(maxsize=1)  # one solve asks again and again: refined, and for its deviation
def solve_closed(problem: Problem, until: float) -> ClosedSolution:
    """The exact flow on [0, until) under bodies and prescribed flow.  Raises ``SeriesError`` where there is none."""
    shape = shape_of(problem)
    closing = Closing.of(problem, shape)
    inputs = problem.inputs(until)
    line = scaled(inputs, problem.diffusion_time, 1.0 / closing.unit)
    bodies = [wall.body for wall in problem.walls]
    place = np.array([0.0 if b is None else b.initial_displacement for b in bodies])
    base, kick = np.zeros(3), np.zeros(3)
    quiet, before, poly = line.quiet.copy(), line.before.copy(), line.poly.copy()
    if problem.start == "steady":
        base = _calm(closing, line, bodies)
    for end, body in enumerate(bodies):
        if body is None:
            continue
        spring = closing.stiffness[end] / problem.diffusion_time
        held = base[end] if problem.start == "steady" else 0.0
        if problem.start == "steady" and body.initial_speed is None and spring > 0.0:
            place[end] = (before[end] - closing.load_on(base, end)) / spring
        poly[:, end, 0] -= spring * place[end] + closing.stiffness[end] * held * line.starts
        poly[:, end, 1] -= closing.stiffness[end] * held
        if problem.start == "steady" and body.initial_speed is not None:
            before[end] = closing.load_on(base, end)
            quiet[0, end] = False
        elif problem.start == "steady":
            before[end] -= spring * place[end]
        elif spring * place[end] != 0.0:
            quiet[0, end] = False
    line = replace(line, poly=np.ascontiguousarray(poly), before=before, quiet=quiet)
    window = 1.01 * until / problem.diffusion_time
    changing = poly.any(axis=(0, 2)) | line.coeff.any(axis=(0, 2)) | (before != 0.0)
    for end, body in enumerate(bodies):
        changing[end] |= body is not None and bool(body.initial_speed)
    gap = Gap(shape, closing, swings(closing), window, changing)
    if problem.start == "rest":
        kick = _kick(gap, np.array([0.0 if b is None else b.initial_speed or 0.0 for b in bodies]))
    return ClosedSolution(problem, gap, line, states(line, gap.no_modes), base, place, kick, inputs.starts)


def _kick(gap: Gap, speed: np.ndarray) -> np.ndarray:
    """Impulses (3,) that give the bodies their ``speed`` (2,), displaced liquid included."""
    out = np.zeros(3)
    moved = np.flatnonzero(gap.closing.body & (gap.closing.mass > 0.0))
    if speed[moved].any():
        out[moved] = np.linalg.solve(_at_once(gap, motion_of(gap.closing), -1)[np.ix_(moved, moved)].T, speed[moved])
    return out


def _calm(closing: Closing, line: Timeline, bodies: list) -> np.ndarray:
    """The steady state (3,) before t = 0.  Raises ``SeriesError`` where there is none."""
    held = {end: b.initial_speed for end, b in enumerate(bodies) if b is not None and b.initial_speed is not None}
    found = closing.settled(line.before, held)
    if found is None:
        raise SeriesError("there is no steady state to start from")
    return found


