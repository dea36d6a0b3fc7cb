"""Smooth pieces of one closed form: values, derivatives, integrals, and what happens between them.

A piece is ``cubic polynomial + sum of Re(coeff * exp(rate * x))`` in its own local time
``x = t - start``.  The march evaluates these arrays and the series integrates them in closed form,
so both see exactly the same drive.  Plain arrays only.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import factorial

import numpy as np

from transient.drive.times import slack

# A difference of value, slope, ... across a break below this share of the drive's own size is round-off.
SAME_VALUE = 1e-11
# So is one that bends the value, over the longer of the two pieces beside it, by less than this share of its size.
SAME_BEND = 1e-14

_BINOMIAL = np.array([[1, 1, 1, 1], [0, 1, 2, 3], [0, 0, 1, 3], [0, 0, 0, 1]], dtype=float)


def shift_cubic(poly: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Coefficients of the same cubics about ``x``.  ``poly`` (..., 4), ``x`` (...); returns (..., 4)."""
    power = np.stack([np.zeros_like(x), np.ones_like(x), x, x * x, x * x * x], axis=-1)
    out = np.zeros_like(poly)
    for order in range(4):
        for degree in range(order, 4):
            out[..., order] += _BINOMIAL[order, degree] * poly[..., degree] * power[..., degree - order + 1]
    return out


def derive_cubic(poly: np.ndarray) -> np.ndarray:
    """Coefficients of the derivatives of cubics (..., 4), lowest power first."""
    out = np.zeros_like(poly)
    out[..., :3] = poly[..., 1:] * np.array([1.0, 2.0, 3.0])
    return out


@dataclass(frozen=True, eq=False)
class Pieces:
    """One input from t = 0 on as P smooth pieces with K exponential terms each.

    ``starts`` (P,) s, ``starts[0] == 0``, strictly increasing; ``poly`` (P, 4) cubic in local time,
    lowest power first; ``coeff``, ``rate`` (P, K) complex, ``rate`` in 1/s (unused terms have coeff 0).
    ``before`` is the value just before t = 0.  The last piece goes on for ever.
    """

    starts: np.ndarray
    poly: np.ndarray
    coeff: np.ndarray
    rate: np.ndarray
    before: float = 0.0

    def locate(self, t: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(piece, offset) of absolute times ``t`` (n,) >= 0; at a break the later piece."""
        t = np.asarray(t, dtype=float)
        piece = np.clip(np.searchsorted(self.starts, t, side="right") - 1, 0, None)
        return piece, t - self.starts[piece]

    def at(self, piece: np.ndarray, offset: np.ndarray, order: int = 0) -> np.ndarray:
        """Value (order 0) or derivative of ``order`` at local times ``offset`` of ``piece``; any equal shapes."""
        piece = np.asarray(piece)
        x = np.asarray(offset, dtype=float)
        poly = self.poly[piece]
        for _ in range(order):
            poly = derive_cubic(poly)
        out = poly[..., 0] + x * (poly[..., 1] + x * (poly[..., 2] + x * poly[..., 3]))
        if self.coeff.shape[1]:
            rate = self.rate[piece]
            out = out + (self.coeff[piece] * rate**order * np.exp(rate * x[..., None])).real.sum(axis=-1)
        return out

    def value(self, t: np.ndarray, order: int = 0) -> np.ndarray:
        """Value or derivative at absolute times; at a break the right-hand limit; before 0, ``before``."""
        t = np.asarray(t, dtype=float)
        piece, offset = self.locate(np.maximum(t, 0.0))
        out = self.at(piece, offset, order)
        return np.where(t < 0.0, self.before if order == 0 else 0.0, out)

    def restart(self, starts: np.ndarray) -> Pieces:
        """The same input with pieces beginning at ``starts``, which must include every own start below the last."""
        starts = np.asarray(starts, dtype=float)
        # A merged start may lie a rounding error before the own start it stands for.
        near = slack(starts)
        owner = np.clip(np.searchsorted(self.starts, starts + near, side="right") - 1, 0, None)
        x = starts - self.starts[owner]
        return self.continued(starts, owner, np.where(np.abs(x) <= near, 0.0, x))

    def continued(self, starts: np.ndarray, owner: np.ndarray, x: np.ndarray) -> Pieces:
        """Pieces at ``starts`` that go on with piece ``owner`` from its local time ``x``; all (n,)."""
        rate = self.rate[owner]
        coeff = self.coeff[owner] * np.exp(rate * x[:, None])
        return Pieces(starts, shift_cubic(self.poly[owner], x), coeff, rate, self.before)

    def jumps(self, order: int = 0) -> np.ndarray:
        """Change of the ``order``-th derivative at each start (P,); at t = 0 against ``before`` held constant.

        Differences that are round-off, of the terms or of the time at which they come, are exactly 0.
        """
        if order not in self._jumps:
            self._jumps[order] = self._find_jumps(order)
        return self._jumps[order]

    @cached_property
    def _jumps(self) -> dict[int, np.ndarray]:
        return {}

    def _find_jumps(self, order: int) -> np.ndarray:
        if self.before == 0.0 and not self.poly.any() and not self.coeff.any():
            return np.zeros(len(self.starts))
        lengths = np.diff(self.starts)
        count = np.arange(len(self.starts))
        right = self.at(count, np.zeros(len(count)), order)
        left = np.concatenate([[self.before if order == 0 else 0.0], self.at(count[:-1], lengths, order)])
        jump = right - left
        noise = SAME_VALUE * self._reach(order) + 4.0 * np.finfo(float).eps * self.starts * self._reach(order + 1)
        if order and len(lengths):
            beside = np.maximum(np.append(lengths, 0.0), np.append(0.0, lengths))
            noise += factorial(order) * SAME_BEND * self._reach(0) / beside**order
        return np.where(np.abs(jump) <= noise, 0.0, jump)

    def size(self, order: int = 0) -> np.ndarray:
        """Bound of the terms of the ``order``-th derivative on each piece (P,); on the last, at its start.

        The size of the terms, not of their sum: what round-off is measured against.
        """
        slope = self.derivative(order)
        lengths = np.append(np.diff(self.starts), 0.0)[:, None]
        powers = lengths ** np.arange(4)
        growth = np.exp(np.maximum(self.rate.real, 0.0) * lengths)
        total = (np.abs(slope.poly) * powers).sum(axis=1) + (np.abs(slope.coeff) * growth).sum(axis=1)
        return np.maximum(total, abs(slope.before))

    def _reach(self, order: int) -> np.ndarray:
        """The larger ``size`` of the two pieces that meet at each start (P,)."""
        size = self.size(order)
        return np.maximum(size, np.concatenate([size[:1], size[:-1]]))

    def derivative(self, order: int = 1) -> Pieces:
        """The ``order``-th derivative on the same pieces; jumps between them leave no trace in it."""
        poly = self.poly
        for _ in range(order):
            poly = derive_cubic(poly)
        return Pieces(self.starts, poly, self.coeff * self.rate**order, self.rate, 0.0 if order else self.before)

    def scaled(self, factor: float) -> Pieces:
        """The pieces times a constant."""
        return Pieces(self.starts, factor * self.poly, factor * self.coeff, self.rate, factor * self.before)

    def integral(self, t: np.ndarray) -> np.ndarray:
        """Integral from 0 to absolute times ``t`` (any shape), in closed form; negative before t = 0."""
        t = np.asarray(t, dtype=float)
        whole = self._within(np.arange(len(self.starts) - 1), np.diff(self.starts))
        piece, offset = self.locate(np.maximum(t, 0.0))
        out = np.append(0.0, np.cumsum(whole))[piece] + self._within(piece, offset)
        return np.where(t < 0.0, self.before * t, out)

    def _within(self, piece: np.ndarray, x: np.ndarray) -> np.ndarray:
        """Integral over ``piece`` from its start to local time ``x``; equal shapes."""
        poly = self.poly[piece]
        out = x * (poly[..., 0] + x * (poly[..., 1] / 2 + x * (poly[..., 2] / 3 + x * poly[..., 3] / 4)))
        if self.coeff.shape[1]:
            turn = self.rate[piece] * x[..., None]
            still = turn == 0.0
            mean = np.where(still, 1.0, np.expm1(turn) / np.where(still, 1.0, turn))
            out = out + (self.coeff[piece] * x[..., None] * mean).real.sum(axis=-1)
        return out
