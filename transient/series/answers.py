"""What is asked of a gap, prepared: every coefficient that the compiled evaluation needs, kept from solve to solve."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import lru_cache

import numpy as np

from transient.series.early import EarlyTable, early_table
from transient.series.gapshape import GapShape
from transient.series.modes import Modes, modes
from transient.series.steady import steady_flow
from transient.series.transfer import NODE, sudden_limit, velocity_transfer, wall_transfer

# Points of the Cauchy integrals: the remainder is analytic to four times the circle, which leaves 4^-32.
_CIRCLE = 32
_TAYLOR = 8
MOST_RESPONSES = 16  # kept of one gap's answer
# Exponentials slower than this share of the last kept rate use the power series of the remainder: leaves 0.01^8.
_NEAR = 0.01
# Exponentials this near the negative axis are held by the contours; nearer than _BESIDE they may meet eigenvalues.
_ON_AXIS, _BESIDE = 1e-3, 0.1


@dataclass(frozen=True, eq=False)
class Answer:
    """Q outputs of a gap: either the two stresses and the mean, or velocities at ``y``; or their rates.

    ``window``: age beyond which ``modes`` alone carry a break's answer.  ``weight`` (M, Q) of each mode.
    ``slow`` (4, 3, Q): output per derivative of each input, what the kept modes leave out.  ``taylor``
    (TAYLOR, 3, Q): power series of that same remainder.  ``sudden`` (3, Q): at the instant of a unit jump.
    ``order`` 1: everything is the time derivative.
    """

    shape: GapShape
    modes: Modes
    window: float
    y: np.ndarray | None
    order: int
    weight: np.ndarray
    slow: np.ndarray
    taylor: np.ndarray
    sudden: np.ndarray
    contours: dict[int, np.ndarray] = field(default_factory=dict)
    tables: dict[tuple[int, int], EarlyTable] = field(default_factory=dict)
    responses: dict[bytes, tuple[np.ndarray, np.ndarray]] = field(default_factory=dict)

    def transfer(self, s: np.ndarray) -> np.ndarray:
        """(S, 3, Q) at complex ``s`` (S,)."""
        out = wall_transfer(self.shape, s) if self.y is None else velocity_transfer(self.shape, s, self.y)
        return out * s[:, None, None] if self.order else out

    def contour(self, level: int) -> np.ndarray:
        """(NODES, 3, Q): the transfer function on the contour for ages window/2^(level+1) .. window/2^level."""
        if level not in self.contours:
            self.contours[level] = self.transfer(NODE / smallest_age(self.window, level))
        return self.contours[level]

    def table(self, level: int, orders: int) -> EarlyTable:
        """Answers to a unit pulse and to unit jumps of value, slope ... (``orders`` in all) at the level's ages."""
        if (level, orders) not in self.tables:
            age = smallest_age(self.window, level)
            self.tables[level, orders] = early_table(self.contour(level), age, orders)
        return self.tables[level, orders]

    def steady_response(self, rates: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """((R, 3, Q) output per exp(rate t), less what the kept modes answer; (R, 3, Q) the whole transfer function).

        The first is exact also where a rate meets an eigenvalue; the second is used off the negative axis only.
        """
        key = rates.tobytes()
        if key not in self.responses:
            if len(self.responses) >= MOST_RESPONSES:
                self.responses.clear()
            self.responses[key] = self._steady_response(rates)
        return self.responses[key]

    def _steady_response(self, rates: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        near = np.abs(rates) <= _NEAR * self.modes.rate[-1]
        decaying = _beside_axis(rates, _BESIDE) & ~near
        gone = decaying & (np.abs(rates) > 0.5 * self.modes.rate[-1])
        rest = np.zeros((len(rates), 3, self.weight.shape[1]), complex)
        whole = np.zeros_like(rest)
        if near.any():
            powers = rates[near, None] ** np.arange(_TAYLOR)
            rest[near] = np.einsum("rk,kiq->riq", powers, self.taylor)
        for index in np.flatnonzero(decaying & ~gone):
            rest[index] = self._circle_mean(rates[index])
        fast = ~_beside_axis(rates, _ON_AXIS) & (np.abs(rates) * self.window > 0.25)
        other = ~near & ~decaying
        ask = other | fast
        if ask.any():
            whole[ask] = self.transfer(rates[ask])
            rest[other] = whole[other] + self._kept(rates[other])
        return rest, whole

    def _kept(self, s: np.ndarray) -> np.ndarray:
        """What the kept modes take from the transfer function, with opposite sign."""
        return _kept_modes(self.modes, self.weight, s)

    def _circle_mean(self, s: complex) -> np.ndarray:
        # The remainder is analytic here though both its parts have poles: its mean over a circle is its value.
        distance = np.sort(np.abs(self.modes.rate + s.real))
        circle = s + 0.5 * (distance[0] + distance[1]) * _directions()
        return (self.transfer(circle) + self._kept(circle)).mean(axis=0)


def _beside_axis(rates: np.ndarray, slope: float) -> np.ndarray:
    """Whether rates lie within a wedge of ``slope`` around the negative real axis."""
    return (rates.real < 0) & (np.abs(rates.imag) <= slope * np.abs(rates.real))


def smallest_age(window: float, level: int | np.ndarray) -> float | np.ndarray:
    """Smallest age that a level's contour serves."""
    return np.ldexp(window, -1 - level)


def mode_count(window: float) -> int:
    """Modes needed so that beyond ``window`` the neglected ones have decayed to exp(-80)."""
    return int(np.ceil(np.sqrt(80.0 / window) / np.pi)) + 2


def _directions() -> np.ndarray:
    return np.exp(2j * np.pi * (np.arange(_CIRCLE) + 0.5) / _CIRCLE)


def _kept_modes(kept: Modes, weight: np.ndarray, s: np.ndarray) -> np.ndarray:
    shares = s[:, None] / (s[:, None] + kept.rate)
    return np.einsum("sm,mi,mq->siq", shares, kept.share, weight, optimize=True)


@lru_cache(maxsize=128)
def wall_answer(shape: GapShape, window: float, order: int) -> Answer:
    """Stress on both walls and the mean velocity (order 0) or their time derivatives (order 1)."""
    kept = modes(shape, mode_count(window))
    steady = steady_flow(shape)
    weight = np.concatenate([kept.stress, kept.mean[:, None]], axis=1)
    start = np.concatenate([steady.stress(), steady.mean()[:, None]], axis=1)
    return _prepare(shape, kept, window, None, order, weight, start)


def velocity_answer(shape: GapShape, window: float, y: np.ndarray) -> Answer:
    """Velocities at ``y`` (k,)."""
    return _velocity_answer(shape, window, tuple(np.asarray(y, dtype=float).tolist()))


@lru_cache(maxsize=4)  # tables over a whole gap weigh megabytes
def _velocity_answer(shape: GapShape, window: float, y: tuple[float, ...]) -> Answer:
    kept = modes(shape, mode_count(window))
    at = np.array(y)
    return _prepare(shape, kept, window, at, 0, kept.velocity(at), steady_flow(shape).velocity(at))


def _prepare(shape, kept, window, y, order, weight, start):  # type: ignore[no-untyped-def]
    # Between two eigenvalues half way up: the coefficients keep their digits relative to the modes left out.
    half = len(kept.root) // 2
    circle = ((kept.root[half - 1] + kept.root[half]) / 2) ** 2 * _directions()
    whole = wall_transfer(shape, circle) if y is None else velocity_transfer(shape, circle, y)
    rest = whole + _kept_modes(kept, weight, circle)
    powers = circle[None, :] ** -np.arange(_TAYLOR)[:, None]
    taylor = np.einsum("ks,siq->kiq", powers, rest).real / _CIRCLE
    taylor[0] = start
    if order:
        # d/dt of the kept modes' answer: their own decay, and what each input's rate gives them directly.
        direct = start - np.einsum("mi,mq->iq", kept.share, weight)
        taylor = np.concatenate([np.zeros_like(taylor[:1]), direct[None], taylor[1:-1]])
        weight = -kept.rate[:, None] * weight
    return Answer(
        shape, kept, window, y, order, np.ascontiguousarray(weight), np.ascontiguousarray(taylor[:4]), taylor,
        sudden_limit(shape, y) if not order else np.zeros((3, weight.shape[1])),
    )
