"""A Python function of time as a drive: cubic pieces to a stated tolerance."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

import numpy as np

from transient.drive.assemble import held, require_finite, require_positive
from transient.drive.pieces import Drive, DriveError, Pieces, Track
from transient.drive.times import SAME_TIME

# Evenly spaced pieces to begin with: a pulse shorter than a fraction of one of them may be missed.
FIRST_PIECES = 32
MOST_CUBICS = 20_000
MOST_JUMPS = 1_000

# Four Chebyshev-Lobatto points of a piece (ends included, so that neighbours meet), and points between them.
_NODES = np.array([0.0, 0.25, 0.75, 1.0])
_PROBES = np.array([0.06, 0.13, 0.4, 0.5, 0.63, 0.88, 0.95])
_TO_CUBIC = np.linalg.inv(np.vander(_NODES, 4, increasing=True)).T
_AT_PROBES = np.vander(_PROBES, 4, increasing=True).T

Function = Callable[[float], float]


def fit(function: Function, until: float, tolerance: float, before: float = 0.0) -> Drive:
    """``function`` over [0, ``until``] (s) by cubic pieces within ``tolerance`` (its own unit), then held.

    Jumps are found to round-off and kept; kinks lie within the tolerance.  The error is measured at seven points of
    each piece, so what happens within a small part of 1/32 of the time can be missed.  ``before`` is the value before
    t = 0.  Raises ``DriveError`` where the function is not finite or the tolerance is out of reach.
    """
    require_positive(until=until, tolerance=tolerance)
    require_finite(before=before)
    edges = np.array([0.0, until])
    while True:
        left, right, cubic, stuck = _bisect(function, edges, tolerance)
        if not stuck.any():
            break
        found = [_jump(function, a, b, until, tolerance) for a, b in zip(left[stuck], right[stuck], strict=True)]
        known, edges = len(edges), np.unique(np.concatenate([edges, found]))
        if len(edges) == known:
            raise _out_of_reach(tolerance, found[0])
        if len(edges) > MOST_JUMPS:
            raise DriveError(f"the function jumps more than {MOST_JUMPS} times", "tolerance")
    left[0] = 0.0
    width = right - left
    poly = _smoothed(function, left, right, cubic, tolerance) / width[:, None] ** np.arange(4)
    end = float(_sample(function, np.array(until)))
    none = np.zeros((len(left) + 1, 0), complex)
    poly = np.concatenate([poly, [[end, 0.0, 0.0, 0.0]]])
    return Drive((Track(Pieces(np.append(left, until), poly, none, none, before)),), before, held(end, until))


def _sample(function: Function, t: np.ndarray) -> np.ndarray:
    """The function at ``t`` (any shape)."""
    out = np.array([float(function(float(x))) for x in t.ravel()]).reshape(t.shape)
    bad = ~np.isfinite(out)
    if bad.any():
        raise DriveError(f"the function gives no finite value at t = {t[bad][0]:g} s")
    return out


def _points(left: np.ndarray, right: np.ndarray, share: np.ndarray) -> np.ndarray:
    """Times (P, n) at ``share`` (n,) of each piece, all before its end: a jump there belongs to the next piece."""
    t = left[:, None] + (right - left)[:, None] * share
    return np.minimum(t, np.nextafter(right, 0.0)[:, None])


def _shortest(t: np.ndarray | float, until: float) -> np.ndarray:
    """Shortest piece at times ``t`` that stays apart from its neighbours."""
    return 4.0 * SAME_TIME * np.maximum(t, 1e-3 * until)


def _bisect(
    function: Function, edges: np.ndarray, tolerance: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """(left, right (P,), cubic (P, 4) on [0, 1], stuck (P,)) of pieces between ``edges``.

    Each is within an eighth of the tolerance, or stuck: too short to halve.
    """
    until = edges[-1]
    sections = [(a, b) for a, b in pairwise(edges) if b - a > _shortest(b, until)]
    grids = [np.linspace(a, b, 1 + max(1, round(FIRST_PIECES * (b - a) / until))) for a, b in sections]
    left, right = np.concatenate([g[:-1] for g in grids]), np.concatenate([g[1:] for g in grids])
    done = []
    count = 0
    while len(left):
        if count + len(left) > MOST_CUBICS:
            raise _out_of_reach(tolerance, left[len(left) // 2])
        cubic = _sample(function, _points(left, right, _NODES)) @ _TO_CUBIC
        miss = np.abs(_sample(function, _points(left, right, _PROBES)) - cubic @ _AT_PROBES).max(axis=1)
        # One slope where neighbours meet costs accuracy: an eighth leaves room for it almost everywhere.
        good = miss <= tolerance / 8.0
        stuck = ~good & (right - left <= 2.0 * _shortest(right, until))
        rest = ~good & ~stuck
        done.append((left[~rest], right[~rest], cubic[~rest], stuck[~rest]))
        count += len(left) - int(rest.sum())
        middle = (left + right)[rest] / 2.0
        left, right = np.concatenate([left[rest], middle]), np.concatenate([middle, right[rest]])
    left, right, cubic, stuck = (np.concatenate(part) for part in zip(*done, strict=True))
    order = np.argsort(left)
    return left[order], right[order], cubic[order], stuck[order]


def _jump(function: Function, left: float, right: float, until: float, tolerance: float) -> float:
    """The first time in (left, right] at which the function is beyond its jump.

    A jump changes next to nothing on either side of it; anything else that steep cannot be fitted.
    """
    wide = 1000.0 * (right - left)
    around = np.array([max(left - wide, 0.0), left, right, min(right + wide, until)])
    before, first, last, after = _sample(function, around)
    if abs(first - before) + abs(after - last) > abs(last - first) / 2.0:
        raise _out_of_reach(tolerance, left)
    while (middle := (left + right) / 2.0) not in (left, right):
        if abs(float(function(middle)) - first) < abs(float(function(middle)) - last):
            left = middle
        else:
            right = middle
    return right


def _out_of_reach(tolerance: float, where: float) -> DriveError:
    return DriveError(f"the tolerance {tolerance:g} is out of reach near t = {where:.9g} s", "tolerance")


def _smoothed(
    function: Function, left: np.ndarray, right: np.ndarray, cubic: np.ndarray, tolerance: float
) -> np.ndarray:
    """The same cubics (P, 4) with one slope where neighbours meet, wherever the tolerance allows it.

    Pieces that merely interpolate leave a small kink at every end, and each kink costs the march a fresh start.
    """
    width = right - left
    exact = _sample(function, _points(left, right, _PROBES))
    value = cubic.sum(axis=1)
    begin, end = cubic[:, 1] / width, (cubic @ [0.0, 1.0, 2.0, 3.0]) / width
    common = (end[:-1] * width[1:] + begin[1:] * width[:-1]) / (width[:-1] + width[1:])
    shared = np.abs(value[:-1] - cubic[1:, 0]) <= tolerance / 8.0
    while True:
        slope_begin = np.append(begin[:1], np.where(shared, common, begin[1:]))
        slope_end = np.append(np.where(shared, common, end[:-1]), end[-1:])
        joined = _hermite(cubic[:, 0], value, slope_begin * width, slope_end * width)
        bad = np.abs(joined @ _AT_PROBES - exact).max(axis=1) > tolerance
        if not (shared & (bad[1:] | bad[:-1])).any():
            return joined
        shared &= ~(bad[1:] | bad[:-1])


def _hermite(first: np.ndarray, last: np.ndarray, begin: np.ndarray, end: np.ndarray) -> np.ndarray:
    """Cubics (P, 4) on [0, 1] from values and slopes at both ends."""
    rise = last - first
    return np.stack([first, begin, 3.0 * rise - 2.0 * begin - end, begin + end - 2.0 * rise], axis=1)
