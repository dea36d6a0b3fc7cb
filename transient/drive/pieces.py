"""What every time history compiles to: tracks of smooth pieces, run once or over and over, and added up."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from transient.drive.piecewise import SAME_VALUE, Pieces
from transient.drive.times import common_period, merge_times, slack

# More pieces than this in one run are refused rather than swallowed.
MOST_PIECES = 2_000_000


class DriveError(ValueError):
    """An input history that cannot be compiled; the message is one plain sentence.

    ``key`` names the offending field of the history kind ("times", "over", ...), or is empty.
    """

    def __init__(self, message: str, key: str = ""):
        super().__init__(message)
        self.key = key


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
        out = (cycle[:, None] * self.every + own[None, :])[:, 1 if self._seamless() else 0 :].ravel()
        out = out if out[:1] == 0.0 else np.append(0.0, out)
        if np.isfinite(self.times) and self.times * self.every <= until:
            out = np.append(out, self.times * self.every)
        return out[(out < until) | (out == 0.0)]

    def _seamless(self) -> bool:
        """Whether the cycle's end and its beginning are one and the same constant, so that no break lies between."""
        own = self.pieces
        ends = own.poly[[0, -1]]
        return len(own.starts) > 1 and not (own.coeff[[0, -1]].any() or ends[:, 1:].any() or ends[0, 0] != ends[1, 0])

    def expand(self, starts: np.ndarray) -> Pieces:
        """This track as plain pieces beginning at ``starts`` (which include its own breaks)."""
        if not np.isfinite(self.every):
            return self.pieces.restart(starts)
        near = slack(starts)
        cycle = np.floor((starts + near) / self.every)
        over = cycle >= self.times
        local = np.where(over, 0.0, np.maximum(starts - cycle * self.every, 0.0))
        local = np.where(local <= near, 0.0, local)
        own = self.pieces
        owner = np.clip(np.searchsorted(own.starts, local + near, side="right") - 1, 0, None)
        x = local - own.starts[owner]
        out = own.continued(starts, owner, np.where(np.abs(x) <= near, 0.0, x))
        out.poly[over] = [self.after, 0.0, 0.0, 0.0]
        out.coeff[over] = 0.0
        return out

    def scaled(self, factor: float) -> Track:
        """The track times a constant."""
        return Track(self.pieces.scaled(factor), self.every, self.times, factor * self.after)

    def derivative(self) -> Track:
        """The rate of change between jumps, cycle by cycle."""
        return Track(self.pieces.derivative(), self.every, self.times, 0.0)

    def integral(self, t: np.ndarray) -> np.ndarray:
        """Integral from 0 to absolute times ``t`` (any shape)."""
        t = np.asarray(t, dtype=float)
        if not np.isfinite(self.every):
            return self.pieces.integral(t)
        cycle = np.clip(np.floor(t / self.every), 0.0, self.times)
        rest = t - cycle * self.every
        part = np.where(cycle < self.times, self.pieces.integral(np.minimum(rest, self.every)), self.after * rest)
        return cycle * self.pieces.integral(np.array(self.every)) + part

    def seam(self) -> float:
        """Change of value from the end of one cycle to the beginning of the next; round-off is exactly 0."""
        last = len(self.pieces.starts) - 1
        length = self.every - self.pieces.starts[last]
        begin, end = self.pieces.at(np.array([0, last]), np.array([0.0, length]))
        slope = np.abs(self.pieces.at(np.array([last]), np.array([length]), 1))[0]
        noise = SAME_VALUE * self.pieces.size().max() + 4.0 * np.finfo(float).eps * self.every * slope
        return 0.0 if abs(begin - end) <= noise else begin - end


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
        tracks = tuple(track.scaled(factor) for track in self.tracks)
        end = self.eventual
        if end.drive is self:
            return _itself(tracks, factor * self.before, end)
        drive = None if end.drive is None else end.drive.scaled(factor)
        return Drive(tracks, factor * self.before, Eventual(drive, end.period, end.since))

    def integral(self, t: np.ndarray) -> np.ndarray:
        """Integral from 0 to absolute times ``t`` (any shape), in closed form; negative before t = 0."""
        t = np.asarray(t, dtype=float)
        return sum((track.integral(t) for track in self.tracks), np.zeros_like(t))

    def derivative(self) -> Drive:
        """The rate of change, 0 before t = 0, with what it ends in.  Raises ``DriveError`` where the drive jumps."""
        jump = self._first_jump()
        if jump is not None:
            raise DriveError(f"the value jumps at t = {jump:g} s, so that its rate of change is infinite there")
        return self._rate()

    def _rate(self) -> Drive:
        """The rate of change between jumps."""
        tracks = tuple(track.derivative() for track in self.tracks)
        end = self.eventual
        if end.drive is self:
            return _itself(tracks, 0.0, end)
        drive = None if end.drive is None else end.drive._rate()
        return Drive(tracks, 0.0, Eventual(drive, end.period, end.since))

    def _first_jump(self) -> float | None:
        """Time of the first jump of the sum (within a repeat, of the repeat alone), or None."""
        first = np.array([track.pieces.at(np.array([0]), np.zeros(1))[0] for track in self.tracks])
        size = sum(track.pieces.size()[0] for track in self.tracks)
        if abs(first.sum() - self.before) > SAME_VALUE * size:
            return 0.0
        found = []
        single = Drive(tuple(track for track in self.tracks if not np.isfinite(track.every)))
        pieces = single.pieces(np.inf)
        found.extend(pieces.starts[1:][pieces.jumps()[1:] != 0.0][:1])
        for track in self.tracks:
            if np.isfinite(track.every):
                found.extend(track.pieces.starts[1:][track.pieces.jumps()[1:] != 0.0][:1])
                found.extend([track.every] if track.times > 1 and track.seam() != 0.0 else [])
        return min(found, default=None)

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
