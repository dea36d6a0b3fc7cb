"""A drive's pieces in diffusion times, and every mode's amplitude along them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Inputs, Problem
from transient.series.answers import Answer
from transient.series.evaluation import add_young, base_piece, fill_old, young_levels
from transient.series.modes import Modes
from transient.series.recursion import fill_states
from transient.series.transfer import NODE, WEIGHT

# Ages beyond which the modes alone answer a break: few modes where pieces are long, many where they are dense.
WINDOWS = (5e-3, 1e-3, 2e-4, 4e-5, 8e-6, 1.6e-6)
# Pieces younger than the window that an instant should meet at most, on average.
_CROWD = 12.0
# Instants evaluated at once: what their contour rows need stays small.
_CHUNK = 4096


@dataclass(frozen=True, eq=False)
class Timeline:
    """Inputs in diffusion times: ``starts`` (P,), ``poly`` (P, 3, 4), ``coeff``, ``exponent`` (P, 3, K), ``before`` (3,).

    ``initial`` amplitudes just before the first break, by eigenvalue: a function of the modes, or None for zero.
    """

    starts: np.ndarray
    poly: np.ndarray
    coeff: np.ndarray
    exponent: np.ndarray
    before: np.ndarray

    @property
    def lengths(self) -> np.ndarray:
        """(P - 1,) lengths of all pieces but the last."""
        return np.diff(self.starts)

    def window(self) -> float:
        """The longest window in which no more than a handful of breaks are young."""
        if len(self.starts) < 2 * _CROWD:
            return WINDOWS[0]
        for window in WINDOWS:
            inside = np.arange(len(self.starts)) - np.searchsorted(self.starts, self.starts - window)
            if inside.mean() <= _CROWD:
                return window
        return WINDOWS[-1]


def timeline(inputs: Inputs, problem: Problem) -> Timeline:
    """The problem's inputs in diffusion times; the pressure drop per length G becomes the speed G gap^2 / mu."""
    scale = np.array([1.0, 1.0, problem.gap**2 / problem.viscosity])
    time = problem.diffusion_time
    poly = inputs.poly * scale[None, :, None] * time ** np.arange(4.0)
    coeff = inputs.coeff * scale[None, :, None]
    return Timeline(
        inputs.starts / time, np.ascontiguousarray(poly), np.ascontiguousarray(coeff),
        np.ascontiguousarray(inputs.rate * time), inputs.before * scale,
    )


@dataclass(frozen=True, eq=False)
class States:
    """Inputs just before each break ``left`` (P, 3); amplitudes ``ahead`` and ``after`` (P, M) across it."""

    left: np.ndarray
    ahead: np.ndarray
    after: np.ndarray


def states(line: Timeline, kept: Modes, initial: np.ndarray | None = None) -> States:
    """Every mode's amplitude at every break, from ``initial`` (M,) (default: the steady flow of ``before``)."""
    pieces, count = len(line.starts), len(kept.rate)
    out = States(np.empty((pieces, 3)), np.empty((pieces, count)), np.empty((pieces, count)))
    start = np.zeros(count) if initial is None else initial
    fill_states(
        line.lengths, line.poly, line.coeff, line.exponent, line.before, kept.rate, kept.share, start,
        out.left, out.ahead, out.after,
    )
    return out


def evaluate(line: Timeline, at: States, answer: Answer, piece: np.ndarray, offset: np.ndarray):  # type: ignore[no-untyped-def]
    """(outputs (n, Q), size of the terms they are the sum of (n, Q)) at ``piece``, ``offset`` (n,)."""
    out = np.empty((len(piece), answer.weight.shape[1]))
    size = np.empty_like(out)
    rates, index = np.unique(np.where(line.coeff == 0, 0, line.exponent).ravel(), return_inverse=True)
    index = index.reshape(line.exponent.shape)
    rest, whole = answer.steady_response(rates)
    for first in range(0, len(piece), _CHUNK):
        part = slice(first, first + _CHUNK)
        _evaluate(line, at, answer, piece[part], offset[part], (rest, whole, index), out[part], size[part])
    return out, size


def _evaluate(line, at, answer, piece, offset, exponentials, out, size):  # type: ignore[no-untyped-def]
    rest, whole, index = exponentials
    lengths = line.lengths
    drive = (line.starts, lengths, line.poly, line.coeff, line.exponent, at.left)
    base = base_piece(line.starts, piece, offset, answer.window)
    kept = answer.modes
    fill_old(
        *drive, at.ahead, at.after, piece, offset, base, kept.rate, kept.share, answer.weight, answer.slow, rest,
        index, out, size,
    )
    if (base == piece).all():
        return
    levels = young_levels(line.starts, piece, offset, base, answer.window)
    used = np.unique(levels[levels >= 0])
    row = np.full(int(used[-1]) + 1 if len(used) else 1, -1)
    row[used] = np.arange(len(used))
    tables = np.stack([answer.table(int(level)) for level in used]) if len(used) else np.zeros(
        (0, len(NODE), 3, out.shape[1]), complex
    )
    smallest = np.ldexp(answer.window, -1 - used)
    add_young(
        *drive, piece, offset, base, levels, row, tables, smallest, NODE, WEIGHT, whole, index, answer.sudden, out,
        size,
    )
