"""Exact histories of any linear case: transfer functions times the exact transform of the drive, piece by piece.

Each piece of each input answers alone: by its onset and its end inverted separately (accurate at any short time
after a break), and, once it lies well in the past, by its transform over the piece as a whole (no difference of
large terms).  Undamped waves lose their pole to a residue.  Long after a piece only the steady answer remains.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.sparse import csr_matrix

from .contour import WINDOW, hyperbola
from .drives import Atom, Piece, Signal
from .gap import Gap, steady
from .transfer import transfer

PAST = 3.0  # a piece ended this many of its own lengths ago is answered as a whole
TURNS = 6.0  # unless its waves turn more than this (rad)
GAUSS = np.polynomial.legendre.leggauss(24)
S_UNIT, W_UNIT = hyperbola()


class Term:
    """One onset: a transform ``image(s)``, valid for times ``since`` < t <= ``until``, counted from ``onset``."""

    def __init__(self, row: int, onset: float, since: float, until: float, piece: Piece, role: str, jump: float):
        self.row, self.onset, self.since, self.until = row, onset, since, until
        self.piece, self.role, self.jump = piece, role, jump
        shift = onset - piece.start
        sign = -1.0 if role == "end" else 1.0
        poly = np.polynomial.Polynomial(piece.poly)
        self.slopes = [sign * float(poly.deriv(k)(shift)) for k in range(1, len(piece.poly))]
        self.waves = [(sign * c * np.exp(sigma * shift), sigma) for c, sigma in piece.waves]
        if role in ("whole", "jump"):
            self.slopes, self.waves = [], []

    def image(self, s: np.ndarray) -> np.ndarray:
        """Transform of this term's drive at ``s``."""
        if self.role == "whole":
            return self._whole(s)
        out = self.jump / s
        for k, slope in enumerate(self.slopes, start=1):
            out = out + slope / s ** (k + 1)
        for c, sigma in self.waves:
            out = out + 0.5 * (c * sigma / (s - sigma) + np.conj(c * sigma) / (s - np.conj(sigma))) / s
        return out

    def _whole(self, s: np.ndarray) -> np.ndarray:
        x, w = GAUSS
        half = (self.piece.end - self.piece.start) / 2
        rate = self.piece.value(self.piece.start + half * (x + 1), 1) * w * half
        return np.exp(np.outer(s, half * (1 - x))) @ rate / s


class Cycles:
    """``count`` whole cycles of a periodic drive, the last ended at ``onset``: a geometric sum in closed form."""

    role, waves = "cycles", ()

    def __init__(self, row: int, cycle: list[Piece], every: float, count: int, end: float):
        self.row, self.onset, self.since, self.until = row, end, end, np.inf
        self.cycle, self.every, self.count = cycle, every, count

    def image(self, s: np.ndarray) -> np.ndarray:
        """Transform counted from the end of the last cycle."""
        total = np.zeros_like(s)
        was = float(self.cycle[-1].value(np.array(self.cycle[-1].end)))
        for piece in self.cycle:
            jump = float(piece.value(np.array(piece.start))) - was
            whole = Term(self.row, piece.end, 0.0, 0.0, piece, "whole", 0.0).image(s)
            total = total + jump / s * np.exp(s * (self.every - piece.start)) + whole * np.exp(
                s * (self.every - piece.end)
            )
            was = float(piece.value(np.array(piece.end)))
        return total * np.expm1(s * self.count * self.every) / np.expm1(s * self.every)


def long_past(row: int, cycle: list[Piece], every: float, first: float, memory: float) -> list[Cycles]:
    """All cycles that ended at ``first`` < 0 or before, in groups short against their distance from t = 0."""
    groups, end = [], first
    while -end < memory:
        count = max(1, int(-end / (PAST * every)))
        groups.append(Cycles(row, cycle, every, count, end))
        end -= count * every
    return groups


def terms_of(row: int, pieces: list[Piece], before: float, memory: float) -> tuple[list[Term], list[tuple]]:
    """(terms, settled): settled holds (time from which it counts, row, change of value) for the steady answer."""
    terms, settled, was = [], [], before
    for piece in pieces:
        a, b = piece.start, piece.end
        jump = float(piece.value(np.array(a))) - was
        fast = max([abs(sigma) * (b - a) for _, sigma in piece.waves], default=0.0)
        leave = b + (PAST * (b - a) if fast <= TURNS else max(PAST * (b - a), memory)) if np.isfinite(b) else np.inf
        terms.append(Term(row, a, a, leave, piece, "start", jump))
        if jump:
            terms.append(Term(row, a, leave, a + memory, piece, "jump", jump))
            settled.append((max(leave, a + memory), row, jump))
        if not np.isfinite(b):
            break
        terms.append(Term(row, b, b, leave, piece, "end", 0.0))
        terms.append(Term(row, b, leave, b + memory, piece, "whole", 0.0))
        was = float(piece.value(np.array(b)))
        settled.append((max(leave, b + memory), row, was - float(piece.value(np.array(a)))))
    return terms, settled


class Response:
    """Histories of one gap under three inputs (inner speed, outer speed, pressure drop per length).

    ``r`` (M,): where velocities are wanted; channels are inner stress, outer stress, mean velocity, w(r).
    """

    def __init__(self, gap: Gap, r: np.ndarray):
        self.gap, self.r = gap, np.asarray(r, dtype=float)
        self.steady = steady(gap, self.r)
        self._windows: dict[tuple[int, int], np.ndarray] = {}
        self._waves: dict[complex, np.ndarray] = {}

    def images(self, window: int, channels: int) -> np.ndarray:
        """Transfer functions on the nodes of a window, the first ``channels`` or all of them."""
        key = (window, channels)
        if key not in self._windows:
            r = self.r[: max(channels - 3, 0)]
            self._windows[key] = transfer(self.gap, S_UNIT / self.first(window), r)
        return self._windows[key]

    def wave(self, sigma: complex) -> np.ndarray:
        """Transfer functions at one point (3, C): the state under exp(sigma t)."""
        if sigma not in self._waves:
            self._waves[sigma] = transfer(self.gap, np.array([sigma]), self.r)[:, :, 0]
        return self._waves[sigma]

    def first(self, window: int) -> float:
        """First time of a window."""
        return self.gap.time * WINDOW**window

    def histories(
        self,
        inputs: list[list[tuple[list[Piece], float]]],
        t: np.ndarray,
        channels: int,
        order: int = 0,
        past: tuple[Cycles, ...] = (),
    ) -> np.ndarray:
        """(channels, len(t)): the state at ``t`` (order 1: its time derivative).

        ``inputs[row]`` lists (pieces, value before the first piece); before that all was steady, but for ``past``.
        """
        terms: list[Any] = list(past)
        settled: list[tuple] = []
        out = np.zeros((channels, len(t)))
        for row, chains in enumerate(inputs):
            for pieces, before in chains:
                if order == 0:
                    out += before * self.steady[row, :channels, None]
                some, rest = terms_of(row, pieces, before, self.gap.memory)
                terms, settled = terms + some, settled + rest
        if order == 0:
            for since, row, change in settled:
                out += np.where(t > since, change, 0.0) * self.steady[row, :channels, None]
        self._add_terms(terms, t, out, order)
        return out

    def _add_terms(self, terms: list[Term], t: np.ndarray, out: np.ndarray, order: int) -> None:
        if not terms:
            return
        which, when = [], []
        rank = np.argsort(t, kind="stable")
        ordered = t[rank]
        for k, term in enumerate(terms):
            lo, hi = np.searchsorted(ordered, [term.since, term.until], side="right")
            which.append(np.full(max(hi - lo, 0), k))
            when.append(rank[lo:hi])
        pair, time = np.concatenate(which), np.concatenate(when)
        x = t[time] - np.array([term.onset for term in terms])[pair]
        window = np.floor(np.log(x / self.gap.time) / np.log(WINDOW)).astype(int)
        for w in np.unique(window):
            here = window == w
            self._add_window(int(w), terms, pair[here], time[here], x[here], out, order)

    def _add_window(
        self, w: int, terms: list[Term], pair: np.ndarray, time: np.ndarray, x: np.ndarray, out: np.ndarray, order: int
    ) -> None:
        s, weight = S_UNIT / self.first(w), W_UNIT / self.first(w)
        growth = np.exp(np.outer(x, s)) * (weight * s**order)
        used, local = np.unique(pair, return_inverse=True)
        image = np.array([terms[k].image(s) for k in used])
        rows = np.array([terms[k].row for k in used])
        transferred = self.images(w, out.shape[0])
        moments, slot = np.unique(time, return_inverse=True)
        for row in np.unique(rows):
            mine = rows[local] == row
            pick = csr_matrix(
                (np.ones(mine.sum()), (slot[mine], np.arange(mine.sum()))), shape=(len(moments), mine.sum())
            )
            summed = pick @ (growth[mine] * image[local[mine]])
            out[:, moments] += (transferred[row][: out.shape[0]] @ summed.T).real
        self._add_poles(w, terms, used, local, time, x, out, order)

    def _add_poles(self, w, terms, used, local, time, x, out, order) -> None:
        """Undamped waves: the residue at their pole in place of the contour's share of it."""
        s, weight = S_UNIT / self.first(w), W_UNIT / self.first(w)
        for j, k in enumerate(used):
            for c, sigma in terms[k].waves:
                if abs(sigma.imag) * WINDOW * self.first(w) <= 1.0:
                    continue
                mine = local == j
                growth = np.exp(np.outer(x[mine], s)) * (weight * s**order) / 2
                share = growth @ (1 / (s - sigma)) + np.conj(growth @ (1 / (s - np.conj(sigma))))
                left = c * (sigma**order * np.exp(sigma * x[mine]) - share)
                state = self.wave(sigma)[terms[k].row, : out.shape[0]]
                np.add.at(out.T, time[mine], (state[:, None] * left).real.T)


def chains(signal: Signal, rest: bool, until: float) -> list[tuple[list[Piece], float]]:
    """A signal's atoms as (pieces, value before t = 0) over [0, until]."""
    return [(_clip(a, until), 0.0 if rest else a.before) for a in signal.atoms]


def _clip(atom: Atom, until: float) -> list[Piece]:
    return [p for p in atom.expand(0.0, until) if p.start < until or p.start == 0.0]


__all__ = ["Response", "chains"]
