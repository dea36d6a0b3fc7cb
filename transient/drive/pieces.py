"""What every time history compiles to: smooth pieces of one closed form.

A piece is ``cubic polynomial + sum of Re(coeff * exp(rate * x))`` in its own local time
``x = t - start``.  The march evaluates these arrays and the series integrates them in closed form,
so both see exactly the same drive.  Plain arrays only.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction

import numpy as np

# Two break points closer than this, relative to the larger time, are one: 0.1 + 0.2 must meet 0.3.
SAME_TIME = 1e-12
# A difference of value, slope, ... across a break below this share of the drive's own size is round-off.
SAME_VALUE = 1e-11
# Periods whose ratio is a fraction with larger terms than this are taken as having no common period.
LARGEST_RATIO = 1000
# More pieces than this in one run are refused rather than swallowed.
MOST_PIECES = 2_000_000

_BINOMIAL = np.array([[1, 1, 1, 1], [0, 1, 2, 3], [0, 0, 1, 3], [0, 0, 0, 1]], dtype=float)


class DriveError(ValueError):
    """An input history that cannot be compiled; the message is one plain sentence.

    ``key`` names the offending field of the history kind ("times", "over", ...), or is empty.
    """

    def __init__(self, message: str, key: str = ""):
        super().__init__(message)
        self.key = key


def shift_cubic(poly: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Coefficients of the same cubics about ``x``.  ``poly`` (..., 4), ``x`` (...); returns (..., 4)."""
    power = np.stack([np.zeros_like(x), np.ones_like(x), x, x * x, x * x * x], axis=-1)
    out = np.zeros_like(poly)
    for order in range(4):
        for degree in range(order, 4):
            out[..., order] += _BINOMIAL[order, degree] * poly[..., degree] * power[..., degree - order + 1]
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
            poly = np.stack(
                [poly[..., 1], 2 * poly[..., 2], 3 * poly[..., 3], np.zeros_like(poly[..., 0])], axis=-1
            )
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
        slack = SAME_TIME * np.maximum(np.abs(starts), starts[-1] * 1e-3)
        owner = np.clip(np.searchsorted(self.starts, starts + slack, side="right") - 1, 0, None)
        x = starts - self.starts[owner]
        x = np.where(np.abs(x) <= slack, 0.0, x)
        poly = shift_cubic(self.poly[owner], x)
        rate = self.rate[owner]
        coeff = self.coeff[owner] * np.exp(rate * x[:, None])
        return Pieces(starts, poly, coeff, rate, self.before)

    def jumps(self, order: int = 0) -> np.ndarray:
        """Change of the ``order``-th derivative at each start (P,); at t = 0 against ``before`` held constant.

        Differences that are round-off of the terms they come from are exactly 0.
        """
        lengths = np.diff(self.starts)
        right = self.at(np.arange(len(self.starts)), np.zeros(len(self.starts)), order)
        left = np.empty_like(right)
        left[0] = self.before if order == 0 else 0.0
        left[1:] = self.at(np.arange(len(lengths)), lengths, order)
        jump = right - left
        size = self.size(order)
        reach = np.maximum(size, np.concatenate([[size[0]], size[:-1]]))
        return np.where(np.abs(jump) <= SAME_VALUE * reach, 0.0, jump)

    def size(self, order: int = 0) -> np.ndarray:
        """Bound of the terms of the ``order``-th derivative on each piece (P,), the last over its first unit.

        The size of the terms, not of their sum: what round-off is measured against.
        """
        lengths = np.append(np.diff(self.starts), 0.0)
        total = np.zeros(len(self.starts))
        for degree in range(order, 4):
            factor = np.prod(np.arange(degree, degree - order, -1)) if order else 1.0
            total += factor * np.abs(self.poly[:, degree]) * lengths ** (degree - order)
        if self.coeff.shape[1]:
            growth = np.exp(np.maximum(self.rate.real, 0.0) * lengths[:, None])
            total += (np.abs(self.coeff) * np.abs(self.rate) ** order * growth).sum(axis=1)
        if order == 0:
            total = np.maximum(total, abs(self.before))
        return total


@dataclass(frozen=True, eq=False)
class Track:
    """Pieces that run once, or over and over with period ``every`` (stored once, taken modulo).

    After ``times`` repeats the value is ``after``; ``every`` infinite: runs once, the last piece held.
    """

    pieces: Pieces
    every: float = np.inf
    times: float = np.inf
    after: float = 0.0

    def breaks(self, until: float) -> np.ndarray:
        """Start times of the pieces that begin before ``until`` (n,)."""
        own = self.pieces.starts
        if not np.isfinite(self.every):
            return own[(own < until) | (own == 0.0)]
        cycles = min(self.times, np.ceil(until / self.every) if np.isfinite(until) else np.inf)
        if cycles * len(own) > MOST_PIECES:
            raise DriveError(
                f"the repeats make {cycles * len(own):.3g} pieces in this run; at most {MOST_PIECES} are taken, "
                "shorten the run or lengthen the cycle",
                "every",
            )
        cycle = np.arange(int(cycles))
        out = (cycle[:, None] * self.every + own[None, :]).ravel()
        if np.isfinite(self.times) and self.times * self.every <= until:
            out = np.append(out, self.times * self.every)
        return out[(out < until) | (out == 0.0)]

    def expand(self, starts: np.ndarray) -> Pieces:
        """This track as plain pieces beginning at ``starts`` (which include its own breaks)."""
        if not np.isfinite(self.every):
            return self.pieces.restart(starts)
        slack = SAME_TIME * np.maximum(starts, self.every)
        cycle = np.floor((starts + slack) / self.every)
        over = cycle >= self.times
        local = np.where(over, 0.0, np.maximum(starts - cycle * self.every, 0.0))
        local = np.where(local <= slack, 0.0, local)
        own = self.pieces
        owner = np.clip(np.searchsorted(own.starts, local + slack, side="right") - 1, 0, None)
        x = local - own.starts[owner]
        x = np.where(np.abs(x) <= slack, 0.0, x)
        poly = shift_cubic(own.poly[owner], x)
        rate = own.rate[owner]
        coeff = own.coeff[owner] * np.exp(rate * x[:, None])
        poly[over] = [self.after, 0.0, 0.0, 0.0]
        coeff[over] = 0.0
        return Pieces(starts, poly, coeff, rate, own.before)


@dataclass(frozen=True, eq=False)
class Eventual:
    """What a drive ends in: ``drive`` is that regime continued back to t = 0, None if there is none.

    ``period`` is None for a constant; ``since`` the time from which the drive equals it exactly
    (infinite where it is only approached, as by a lag).
    """

    drive: Drive | None
    period: float | None = None
    since: float = 0.0


@dataclass(frozen=True, eq=False)
class Drive:
    """One input over all t: the sum of its tracks.  ``before`` is its value before t = 0."""

    tracks: tuple[Track, ...]
    before: float = 0.0
    eventual: Eventual = field(default_factory=lambda: Eventual(None))

    def breaks(self, until: float) -> np.ndarray:
        """All break times below ``until`` including 0, merged and sorted (n,)."""
        return merge_times([track.breaks(until) for track in self.tracks] or [np.zeros(1)])

    def pieces(self, until: float, starts: np.ndarray | None = None) -> Pieces:
        """The drive over [0, until) as plain pieces, on its own breaks or on given ``starts``."""
        if starts is None:
            starts = self.breaks(until)
        parts = [track.expand(starts) for track in self.tracks]
        poly = np.zeros((len(starts), 4))
        for part in parts:
            poly = poly + part.poly
        coeff = np.concatenate([np.zeros((len(starts), 0), complex), *(p.coeff for p in parts)], axis=1)
        rate = np.concatenate([np.zeros((len(starts), 0), complex), *(p.rate for p in parts)], axis=1)
        used = (np.abs(coeff) > 0).any(axis=0)
        return Pieces(starts, poly, coeff[:, used], rate[:, used], self.before)

    def scaled(self, factor: float) -> Drive:
        """The drive times a constant."""
        tracks = tuple(
            Track(
                Pieces(
                    t.pieces.starts, factor * t.pieces.poly, factor * t.pieces.coeff, t.pieces.rate,
                    factor * t.pieces.before,
                ),
                t.every, t.times, factor * t.after,
            )
            for t in self.tracks
        )
        end = self.eventual
        if end.drive is self:
            return _itself(tracks, factor * self.before, end)
        drive = None if end.drive is None else end.drive.scaled(factor)
        return Drive(tracks, factor * self.before, Eventual(drive, end.period, end.since))

    def minus(self, other: Drive) -> Drive:
        """The difference of two drives (its ``eventual`` is not worked out)."""
        return Drive(self.tracks + other.scaled(-1.0).tracks, self.before - other.before)


def _itself(tracks: tuple[Track, ...], before: float, end: Eventual) -> Drive:
    """A drive that is its own eventual regime (a constant or a periodic one from t = 0 on)."""
    drive = Drive(tracks, before, Eventual(None, end.period, end.since))
    object.__setattr__(drive, "eventual", Eventual(drive, end.period, end.since))
    return drive


def constant(value: float, before: float | None = None) -> Drive:
    """A drive held at ``value`` from t = 0 on; ``before`` (default: the same) is its value before."""
    poly = np.array([[value, 0.0, 0.0, 0.0]])
    none = np.zeros((1, 0), complex)
    was = value if before is None else before
    return _itself((Track(Pieces(np.zeros(1), poly, none, none, was)),), was, Eventual(None, None, 0.0))


def periodic(tracks: tuple[Track, ...], period: float, before: float) -> Drive:
    """A drive that is periodic from t = 0 on."""
    return _itself(tracks, before, Eventual(None, period, 0.0))


def total(drives: list[Drive]) -> Drive:
    """The sum of drives, with what the sum ends in (a common period where the periods have one)."""
    tracks = tuple(track for drive in drives for track in drive.tracks)
    before = sum(drive.before for drive in drives)
    ends = [drive.eventual for drive in drives]
    if any(end.drive is None for end in ends):
        return Drive(tracks, before, Eventual(None))
    period, common = common_period([end.period for end in ends])
    if not common:
        return Drive(tracks, before, Eventual(None))
    since = max((end.since for end in ends), default=0.0)
    if all(drive.eventual.drive is drive for drive in drives):
        return _itself(tracks, before, Eventual(None, period, since))
    regime = total([end.drive for end in ends])
    return Drive(tracks, before, Eventual(regime, period, since))


def common_period(periods: list[float | None]) -> tuple[float | None, bool]:
    """(smallest common period, whether there is one); constants (None) do not count."""
    real = [p for p in periods if p is not None]
    if not real:
        return None, True
    base = real[0]
    multiple = Fraction(1)
    for p in real[1:]:
        ratio = Fraction(p / base).limit_denominator(LARGEST_RATIO)
        if ratio.numerator > LARGEST_RATIO or ratio <= 0 or abs(float(ratio) - p / base) > 1e-9 * p / base:
            return None, False
        # lcm of two fractions in lowest terms
        num = multiple.numerator * ratio.numerator // _gcd(multiple.numerator, ratio.numerator)
        multiple = Fraction(num, _gcd(multiple.denominator, ratio.denominator))
    return base * float(multiple), True


def _gcd(a: int, b: int) -> int:
    while b:
        a, b = b, a % b
    return a


def merge_times(groups: list[np.ndarray]) -> np.ndarray:
    """Sorted union of break times; those that differ by round-off only become one (the earliest given)."""
    times = np.sort(np.concatenate(groups))
    if len(times) == 0:
        return times
    scale = np.maximum(np.abs(times[1:]), times[-1] * 1e-3)
    keep = np.concatenate([[True], np.diff(times) > SAME_TIME * scale])
    return times[keep]
