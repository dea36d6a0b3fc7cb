"""A drive's pieces in diffusion times, and every mode's amplitude along them."""

from __future__ import annotations

import os
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from transient.gap.problem import Inputs, Problem
from transient.series.answers import Answer, mode_count
from transient.series.early import ALL
from transient.series.evaluation import base_piece, fill_old, young_levels
from transient.series.gapshape import SeriesError
from transient.series.modes import Modes
from transient.series.recursion import fill_states
from transient.series.transfer import NODE, WEIGHT
from transient.series.young import add_young

# Ages beyond which the modes alone answer a break: few modes where pieces are long, many where they are dense.
WINDOWS = (5e-3, 1e-3, 2e-4, 4e-5, 8e-6)
# Measured costs in ns of a mode across a break, a mode at an instant, a young break at an instant.
_STATE, _MODE, _BREAK = 20.0, 40.0, 300.0
# Amplitudes kept for one case: 12 bytes each.
MOST_STATES = 60_000_000
# Instants evaluated at once: what their contour rows need stays small.
_CHUNK = 4096
_WORTH_THREADS = 3  # parts from which threads are worth starting


@dataclass(frozen=True, eq=False)
class Timeline:
    """Inputs in diffusion times: ``starts`` (P,), ``poly`` (P, 3, 4), ``coeff``, ``exponent`` (P, 3, K).

    ``quiet`` (P, 3): where an input's value does not jump; a break late in a run moves by the round-off of its time,
    and a steep ramp with it, which must not pass for a jump.
    """

    starts: np.ndarray
    poly: np.ndarray
    coeff: np.ndarray
    exponent: np.ndarray
    before: np.ndarray
    quiet: np.ndarray

    @cached_property
    def lengths(self) -> np.ndarray:
        """(P - 1,) lengths of all pieces but the last."""
        return np.diff(self.starts)

    @cached_property
    def exponents(self) -> tuple[np.ndarray, np.ndarray]:
        """Different exponents (R,) and which of them each term has (P, 3, K)."""
        used = np.where(self.coeff == 0, 0, self.exponent)
        rates, index = np.unique(used.ravel(), return_inverse=True)
        return rates, index.reshape(used.shape)

    @property
    def orders(self) -> int:
        """Orders in which answers to breaks are needed: pulse, jump of value, of slope ..., as the drive bends."""
        if self.coeff.any():
            return ALL
        bent = np.flatnonzero(self.poly.any(axis=(0, 1)))
        return 2 + int(bent[-1]) if len(bent) else 2

    def window(self) -> float:
        """Age up to which breaks are answered one by one: what costs least, few modes or few young breaks."""
        pieces = len(self.starts)
        instants = max(pieces, 500)
        best, cheapest = WINDOWS[0], np.inf
        for window in WINDOWS:
            young = (np.arange(pieces) - np.searchsorted(self.starts, self.starts - window)).mean()
            cost = mode_count(window) * (pieces * _STATE + instants * _MODE) + instants * young * _BREAK
            if cost < cheapest and pieces * mode_count(window) <= MOST_STATES / 4:
                best, cheapest = window, cost
        return best


def timeline(inputs: Inputs, problem: Problem) -> Timeline:
    """The problem's inputs in diffusion times; the pressure drop per length G becomes the speed G gap^2 / mu."""
    return scaled(inputs, problem.diffusion_time, np.array([1.0, 1.0, problem.gap**2 / problem.viscosity]))


def scaled(inputs: Inputs, time: float, scale: np.ndarray) -> Timeline:
    """Inputs in units of ``time`` and times ``scale`` (3,)."""
    poly = inputs.poly * scale[None, :, None] * time ** np.arange(4.0)
    coeff = inputs.coeff * scale[None, :, None]
    return Timeline(
        inputs.starts / time, np.ascontiguousarray(poly), np.ascontiguousarray(coeff),
        np.ascontiguousarray(inputs.rate * time), inputs.before * scale,
        np.stack([inputs.row(i).jumps(0) == 0.0 for i in range(3)], axis=1),
    )


@dataclass(frozen=True, eq=False)
class States:
    """Inputs just before each break ``left`` (P, 3) and their ``jump``; amplitudes just before it ``ahead`` (P, M).

    ``reach`` (P, M): the magnitudes of all terms that ``ahead`` is the sum of.
    """

    left: np.ndarray
    jump: np.ndarray
    ahead: np.ndarray
    reach: np.ndarray


def states(
    line: Timeline, kept: Modes, initial: np.ndarray | None = None, worst: np.ndarray | None = None
) -> States:
    """Every mode's amplitude at every break, from ``initial`` (M,) (default: the steady flow of ``before``).

    ``worst`` (M,): the magnitudes that ``initial`` is the sum of.  Raises SeriesError for more breaks than fit.
    """
    pieces, count = len(line.starts), len(kept.rate)
    if pieces * count > MOST_STATES:
        raise SeriesError(f"the drive has {pieces} breaks, more than the series follows at once")
    out = States(
        np.empty((pieces, 3)), np.empty((pieces, 3)), np.empty((pieces, count)), np.empty((pieces, count), np.float32)
    )
    start = np.zeros(count) if initial is None else initial
    fill_states(
        line.lengths, line.poly, line.coeff, line.exponent, line.before, kept.rate, kept.share, start,
        np.abs(start) if worst is None else worst, out.left, out.jump, out.ahead, out.reach,
    )
    begins = line.poly[:, :, 0] + line.coeff.real.sum(axis=2)
    out.left[line.quiet] = begins[line.quiet]
    out.jump[line.quiet] = 0.0
    return out


def evaluate(line: Timeline, at: States, answer: Answer, piece: np.ndarray, offset: np.ndarray):  # type: ignore[no-untyped-def]
    """(outputs (n, Q), size of the terms they are the sum of (n, Q)) at ``piece``, ``offset`` (n,)."""
    out = np.empty((len(piece), answer.weight.shape[1]))
    size = np.empty_like(out)
    rates, index = line.exponents
    rest, whole = answer.steady_response(rates)
    parts = [slice(first, first + _CHUNK) for first in range(0, len(piece), _CHUNK)]

    def fill(part: slice) -> None:
        _evaluate(line, at, answer, piece[part], offset[part], (rest, whole, index), out[part], size[part])

    if len(parts) < _WORTH_THREADS:
        for part in parts:
            fill(part)
    else:  # compiled code runs without the interpreter's lock, and every part writes to its own place
        from concurrent.futures import ThreadPoolExecutor  # not needed by most runs

        with ThreadPoolExecutor(os.cpu_count()) as threads:
            list(threads.map(fill, parts))
    return out, size


def _evaluate(line, at, answer, piece, offset, exponentials, out, size):  # type: ignore[no-untyped-def]
    rest, whole, index = exponentials
    lengths = line.lengths
    drive = (line.starts, lengths, line.poly, line.coeff, line.exponent, at.left)
    base = base_piece(line.starts, piece, offset, answer.window)
    kept = answer.modes
    fill_old(
        *drive, at.jump, at.ahead, at.reach, piece, offset, base, kept.rate, kept.share, answer.weight, answer.slow,
        rest, index, out, size,
    )
    if (base == piece).all():
        return
    levels = young_levels(line.starts, piece, offset, base, answer.window)
    used = np.unique(np.maximum(levels, 0))
    row = np.full(int(used[-1]) + 1, -1)
    row[used] = np.arange(len(used))
    orders = line.orders
    tables = [answer.table(int(level), orders) for level in used]
    series, reach = np.stack([t.series for t in tables]), np.stack([t.reach for t in tables])
    contours = np.stack([answer.contour(int(level)) for level in used])
    smallest = np.ldexp(answer.window, -1 - used)
    add_young(
        *drive, piece, offset, base, levels, row, series, reach, contours, smallest, NODE, WEIGHT, whole, index,
        answer.sudden, out, size,
    )
