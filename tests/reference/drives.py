"""The contract's input histories as exact pieces, written apart from the product.

A history is a dict of plain SI numbers, for example ``{"kind": "ramp", "to": 0.3, "over": 0.05}``, or a bare
number.  It becomes a list of atoms whose sum it is; an atom is a chain of pieces
``cubic in x + sum of Re(c exp(sigma x))`` with ``x = t - start``.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from math import inf, pi, sqrt
from typing import Any

import numpy as np
from scipy.interpolate import PchipInterpolator

History = float | dict[str, Any]
Wave = tuple[complex, complex]


@dataclass(frozen=True)
class Piece:
    """One smooth stretch from ``start`` to ``end``: cubic ``poly`` (lowest power first) and ``waves`` (c, sigma)."""

    start: float
    end: float
    poly: tuple[float, ...]
    waves: tuple[Wave, ...] = ()

    def value(self, t: np.ndarray, order: int = 0) -> np.ndarray:
        """Value, or derivative of ``order``, at absolute times (one-sided limits at the ends)."""
        x = np.asarray(t, dtype=float) - self.start
        out = np.polynomial.Polynomial(self.poly).deriv(order)(x) if order else np.polynomial.Polynomial(self.poly)(x)
        for c, sigma in self.waves:
            out = out + (c * sigma**order * np.exp(sigma * x)).real
        return out

    def shifted(self, by: float) -> Piece:
        """The same stretch later by ``by``."""
        return Piece(self.start + by, self.end + by, self.poly, self.waves)


@dataclass(frozen=True)
class Atom:
    """One summand of a history: its value ``before`` t = 0, its pieces from t = 0 on, and what it ends in.

    ``final`` is the eventual constant; None where it goes on for ever, with ``period``.
    ``every``: the pieces are one cycle, repeated without end.
    """

    before: float
    pieces: tuple[Piece, ...]
    final: float | None
    period: float | None = None
    every: float | None = None

    def expand(self, begin: float, until: float) -> list[Piece]:
        """Pieces that cover [begin, until]; ``begin`` below 0 only for a periodic atom (continued backwards)."""
        if self.every is None:
            if begin < 0.0 and self.period is not None:
                return [_continued(self.pieces[-1], begin)]
            return [p for p in self.pieces if p.start < until or p.start == 0.0]
        first, last = int(np.floor(begin / self.every)), int(np.ceil(until / self.every))
        return [p.shifted(k * self.every) for k in range(first, max(last, first + 1)) for p in self.pieces]

    def value(self, t: float) -> float:
        """Value at t >= 0, the limit from the right at a break."""
        if self.every is not None:
            t = t % self.every
        owner = [p for p in self.pieces if p.start <= t][-1]
        return float(owner.value(np.array(t)))


def _continued(piece: Piece, begin: float) -> Piece:
    waves = tuple((c * np.exp(sigma * (begin - piece.start)), sigma) for c, sigma in piece.waves)
    return Piece(begin, piece.end, piece.poly, waves)


@dataclass(frozen=True)
class Signal:
    """A history: the sum of its atoms."""

    atoms: tuple[Atom, ...] = field(default_factory=tuple)

    @property
    def before(self) -> float:
        """Value before t = 0."""
        return sum(a.before for a in self.atoms)

    def value(self, t: float) -> float:
        """Value at t >= 0."""
        return sum(a.value(t) for a in self.atoms)

    def breaks(self, until: float) -> np.ndarray:
        """Times below ``until`` at which a piece begins, 0 among them, near-equal ones merged."""
        times = np.unique([0.0] + [p.start for a in self.atoms for p in a.expand(0.0, until)])
        times = times[times < until * (1 - 1e-12)] if until > 0 else times
        keep = np.concatenate([[True], np.diff(times) > 1e-12 * np.maximum(times[1:], 1e-300)])
        return times[keep]

    def jumps(self, until: float, before: float) -> list[tuple[float, float]]:
        """(time, change of value) at the breaks below ``until``, against ``before`` at t = 0; round-off left out."""
        out: dict[float, float] = {}
        breaks = self.breaks(until)
        size = abs(before) + sum(abs(c) for a in self.atoms for p in a.pieces for c in _sizes(p))
        for atom in self.atoms:
            was = atom.before
            for piece in atom.expand(0.0, until):
                if piece.start < until * (1 - 1e-12) or piece.start == 0.0:
                    at = float(breaks[np.argmin(np.abs(breaks - piece.start))])
                    out[at] = out.get(at, 0.0) + float(piece.value(np.array(piece.start))) - was
                was = float(piece.value(np.array(piece.end))) if np.isfinite(piece.end) else 0.0
        out[0.0] = out.get(0.0, 0.0) + self.before - before
        return [(t, j) for t, j in sorted(out.items()) if abs(j) > 1e-10 * size]

    @property
    def eventual(self) -> tuple[str, float | None]:
        """("constant", None), ("periodic", period) or ("neither", None)."""
        periods = [a.period for a in self.atoms if a.final is None]
        if not periods:
            return "constant", None
        if any(p is None for p in periods):
            return "neither", None
        common = common_period([p for p in periods if p is not None])
        return ("periodic", common) if common is not None else ("neither", None)


def _sizes(piece: Piece) -> list[float]:
    length = piece.end - piece.start if np.isfinite(piece.end) else 0.0
    return [abs(c) * length**k for k, c in enumerate(piece.poly) if c] + [abs(c) for c, _ in piece.waves]


def common_period(periods: list[float]) -> float | None:
    """Smallest common multiple of periods whose ratios are plain fractions; None where there is none."""
    base, top, bottom = periods[0], 1, None
    ratios = [Fraction(p / base).limit_denominator(200) for p in periods]
    if any(abs(float(f) - p / base) > 1e-9 * p / base for f, p in zip(ratios, periods, strict=True)):
        return None
    top, bottom = 1, 0
    for f in ratios:
        top = top * f.numerator // np.gcd(top, f.numerator)
        bottom = np.gcd(bottom, f.denominator)
    return base * float(top) / float(bottom)


def _chain(before: float, at: float, first: float, rest: list[Piece], final: float | None) -> Atom:
    """Hold ``first`` until ``at``, then ``rest`` (already placed)."""
    head = [Piece(0.0, at, (first,))] if at > 0.0 else []
    return Atom(before, tuple(head + rest), final)


def _step(h: dict[str, Any]) -> list[Atom]:
    at, was = h.get("at", 0.0), h.get("from", 0.0)
    return [_chain(was, at, was, [Piece(at, inf, (h["to"],))], h["to"])]


def _ramp(h: dict[str, Any]) -> list[Atom]:
    at, was, to, over = h.get("at", 0.0), h.get("from", 0.0), h["to"], h["over"]
    rest = [Piece(at, at + over, (was, (to - was) / over)), Piece(at + over, inf, (to,))]
    return [_chain(was, at, was, rest, to)]


def _smooth_ramp(h: dict[str, Any]) -> list[Atom]:
    at, was, to, over = h.get("at", 0.0), h.get("from", 0.0), h["to"], h["over"]
    half = (to - was) / 2
    rest = [Piece(at, at + over, (was + half,), ((-half, 1j * pi / over),)), Piece(at + over, inf, (to,))]
    return [_chain(was, at, was, rest, to)]


def _s_curve(h: dict[str, Any]) -> list[Atom]:
    at, was, to = h.get("at", 0.0), h.get("from", 0.0), h["to"]
    change, limit, jerk = to - was, h["acceleration"], h["jerk"]
    sign = 1.0 if change >= 0 else -1.0
    build = limit / jerk if abs(change) >= limit**2 / jerk else sqrt(abs(change) / jerk)
    hold = max(abs(change) / (jerk * build) - build, 0.0) if change else 0.0
    rest, t, v, a = [], at, was, 0.0
    for length, j in ((build, sign * jerk), (hold, 0.0), (build, -sign * jerk)):
        if length > 1e-12 * (2 * build + hold):
            rest.append(Piece(t, t + length, (v, a, j / 2)))
            v, a, t = v + a * length + j * length**2 / 2, a + j * length, t + length
    return [_chain(was, at, was, [*rest, Piece(t, inf, (to,))], to)]


def _trapezoid(h: dict[str, Any]) -> list[Atom]:
    at, was, to = h.get("at", 0.0), h.get("from", 0.0), h["to"]
    times = at + np.cumsum([0.0, h["rise"], h["hold"], h["fall"]])
    return [_linear(np.array([was, to, to, was]), times, was)]


def _lag(h: dict[str, Any]) -> list[Atom]:
    at, was, to = h.get("at", 0.0), h.get("from", 0.0), h["to"]
    return [_chain(was, at, was, [Piece(at, inf, (to,), ((was - to, -1.0 / h["time_constant"] + 0j),))], to)]


def _sine(h: dict[str, Any]) -> list[Atom]:
    at, mean = h.get("at", 0.0), h.get("mean", 0.0)
    frequency = h["frequency"] if "frequency" in h else 1.0 / h["period"]
    wave = (-1j * h["amplitude"] * np.exp(1j * h.get("phase", 0.0)), 2j * pi * frequency)
    head = [Piece(0.0, at, (mean,))] if at > 0.0 else []
    return [Atom(mean, (*head, Piece(at, inf, (mean,), (wave,))), None, 1.0 / frequency)]


def _half_sine(h: dict[str, Any]) -> list[Atom]:
    at, over = h.get("at", 0.0), h["over"]
    rest = [Piece(at, at + over, (0.0,), ((-1j * h["amplitude"], 1j * pi / over),)), Piece(at + over, inf, (0.0,))]
    return [_chain(0.0, at, 0.0, rest, 0.0)]


def _linear(values: np.ndarray, times: np.ndarray, before: float) -> Atom:
    pieces = [Piece(0.0, times[0], (values[0],))] if times[0] > 0.0 else []
    for t0, t1, v0, v1 in zip(times[:-1], times[1:], values[:-1], values[1:], strict=True):
        if t1 > t0:
            pieces.append(Piece(t0, t1, (v0, (v1 - v0) / (t1 - t0))))
    return Atom(before, (*pieces, Piece(times[-1], inf, (values[-1],))), float(values[-1]))


def _table(h: dict[str, Any]) -> list[Atom]:
    times, values = np.asarray(h["times"], dtype=float), np.asarray(h["values"], dtype=float)
    if h.get("interpolation", "linear") == "linear":
        return [_linear(values, times, float(values[0]))]
    cubic = PchipInterpolator(times, values).c[::-1]
    pieces = [Piece(0.0, times[0], (values[0],))] if times[0] > 0.0 else []
    pieces += [Piece(times[i], times[i + 1], tuple(cubic[:, i])) for i in range(len(times) - 1)]
    return [Atom(float(values[0]), (*pieces, Piece(times[-1], inf, (values[-1],))), float(values[-1]))]


def _sum(h: dict[str, Any]) -> list[Atom]:
    return [atom for part in h["parts"] for atom in signal(part).atoms]


def _cycle(atom: Atom, every: float) -> tuple[Piece, ...]:
    return tuple(Piece(p.start, min(p.end, every), p.poly, p.waves) for p in atom.expand(0.0, every) if p.start < every)


def _repeat(h: dict[str, Any]) -> list[Atom]:
    every, out = h["every"], []
    for atom in signal(h["part"]).atoms:
        cycle = _cycle(atom, every)
        if h.get("times") is None:
            out.append(Atom(atom.before, cycle, None, every, every))
            continue
        end = float(cycle[-1].value(np.array(every)))
        pieces = [p.shifted(k * every) for k in range(h["times"]) for p in cycle]
        out.append(Atom(atom.before, (*pieces, Piece(h["times"] * every, inf, (end,))), end))
    return out


KINDS = {
    "step": _step,
    "ramp": _ramp,
    "smooth_ramp": _smooth_ramp,
    "s_curve": _s_curve,
    "trapezoid": _trapezoid,
    "lag": _lag,
    "sine": _sine,
    "half_sine": _half_sine,
    "table": _table,
    "sum": _sum,
    "repeat": _repeat,
}


def signal(history: History | None) -> Signal:
    """The exact pieces of a history given in SI; None is zero, a bare number is held from t = 0 on."""
    if history is None:
        return Signal((Atom(0.0, (Piece(0.0, inf, (0.0,)),), 0.0),))
    if not isinstance(history, dict):
        return Signal((Atom(float(history), (Piece(0.0, inf, (float(history),)),), float(history)),))
    return Signal(tuple(KINDS[history["kind"]](history)))


def slope(of: Signal) -> Signal:
    """The derivative of a history without jumps: the speed that belongs to a displacement."""
    return Signal(tuple(_slope(a) for a in of.atoms))


def _slope(atom: Atom) -> Atom:
    pieces = tuple(
        Piece(
            p.start,
            p.end,
            tuple(k * c for k, c in enumerate(p.poly) if k) or (0.0,),
            tuple((c * sigma, sigma) for c, sigma in p.waves),
        )
        for p in atom.pieces
    )
    return Atom(0.0, pieces, None if atom.final is None else 0.0, atom.period, atom.every)
