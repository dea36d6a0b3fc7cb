"""Values at given times, joined by straight lines or by a monotone cubic."""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from transient.drive.assemble import held
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, DriveError, Pieces, Track, constant
from transient.drive.times import SAME_TIME

# Rows that lie on the line between their neighbours within this share of the largest value are no breaks.
ON_LINE = 4.0 * np.finfo(float).eps


def build(times: np.ndarray, values: np.ndarray, interpolation: str = "linear") -> Drive:
    """Rows (``times`` (n,) s, ``values`` (n,)); the first value holds before them and the last after.

    Two rows at one time are a jump.  ``interpolation`` "linear", or "smooth": the monotone piecewise cubic of
    Fritsch & Butland (1984), built afresh between jumps.  Raises ``DriveError`` naming the row.
    """
    if interpolation not in INTERPOLATIONS:
        raise DriveError(f"interpolation must be one of {', '.join(INTERPOLATIONS)}", "interpolation")
    t, v = np.asarray(times, dtype=float).ravel(), np.asarray(values, dtype=float).ravel()
    _check_rows(t, v, least=1 if interpolation == "linear" else 2)
    joined = np.diff(t) > SAME_TIME * t[1:]
    _check_jumps(joined)
    if np.all(v == v[0]):
        return constant(float(v[0]))
    starts, poly = INTERPOLATIONS[interpolation](t, v, joined)
    if starts[0] > 0.0:
        starts = np.concatenate([[0.0], starts])
        poly = np.concatenate([[[v[0], 0.0, 0.0, 0.0]], poly])
    held_on = np.concatenate([[False], (poly[1:] == poly[:-1]).all(axis=1) & ~poly[1:, 1:].any(axis=1)])
    starts, poly = starts[~held_on], poly[~held_on]
    none = np.zeros((len(starts), 0), complex)
    moving = np.flatnonzero(v != v[-1])[-1]
    return Drive(
        (Track(Pieces(starts, poly, none, none, float(v[0]))),), float(v[0]), held(float(v[-1]), float(t[moving + 1]))
    )


def _check_rows(t: np.ndarray, v: np.ndarray, least: int) -> None:
    if len(t) != len(v):
        raise DriveError(f"there are {len(t)} times and {len(v)} values; both need the same number", "values")
    if len(t) < least:
        raise DriveError(f"the table has {len(t)} rows; at least {least} needed", "times")
    for key, column in (("times", t), ("values", v)):
        bad = np.flatnonzero(~np.isfinite(column))
        if len(bad):
            raise DriveError(f"row {bad[0] + 1} holds no finite number in its {key[:-1]}", key)
    if t[0] < 0.0:
        raise DriveError(f"row 1 has the time {t[0]:g} s; times count from the start of the run, t = 0", "times")
    back = np.flatnonzero(np.diff(t) < 0.0)
    if len(back):
        row = back[0]
        raise DriveError(f"row {row + 2} goes back in time, from {t[row]:g} s to {t[row + 1]:g} s", "times")


def _check_jumps(joined: np.ndarray) -> None:
    double = np.flatnonzero(~joined[1:] & ~joined[:-1])
    if len(double):
        row = double[0] + 1
        raise DriveError(f"rows {row} to {row + 2} share one time; a jump is two rows at one time", "times")


def _lines(t: np.ndarray, v: np.ndarray, joined: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(starts, poly) of straight lines from the first row on, without rows that bend nothing."""
    t, v, joined = _bends(t, v, joined)
    # A jump's first row ends its line and starts none.
    starting = np.append(joined, True)
    poly = np.zeros((len(t), 4))
    poly[:, 0] = v
    poly[:-1, 1][joined] = np.diff(v)[joined] / np.diff(t)[joined]
    return t[starting], poly[starting]


def _bends(t: np.ndarray, v: np.ndarray, joined: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The rows where something happens: ends, jumps, and changes of slope beyond round-off."""
    slope = np.zeros(len(joined))
    slope[joined] = np.diff(v)[joined] / np.diff(t)[joined]
    span = np.where(joined, np.diff(t), 0.0)
    close = ON_LINE * np.abs(v).max()
    keep = np.ones(len(t), dtype=bool)
    bend = np.abs(np.diff(slope)) * np.maximum(span[1:], span[:-1])
    keep[1:-1] = (bend > close) | ~joined[1:] | ~joined[:-1]
    # Small bends may add up: where the long line misses a row that was left out, all rows stay.
    if not keep.all() and np.abs(np.interp(t, t[keep], v[keep]) - v)[~keep].max() > close:
        return t, v, joined
    return t[keep], v[keep], np.diff(t[keep]) > SAME_TIME * t[keep][1:]


def _smooth(t: np.ndarray, v: np.ndarray, joined: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(starts, poly) of the monotone cubic between jumps."""
    from scipy.interpolate import PchipInterpolator

    poly = np.zeros((len(t), 4))
    poly[:, 0] = v
    poly[:-1, 1][joined] = np.diff(v)[joined] / np.diff(t)[joined]
    edges = np.concatenate([[0], np.flatnonzero(~joined) + 1, [len(t)]])
    for first, last in pairwise(edges):
        # Two rows between jumps are a straight line, which is in place already.
        if last - first > 2:
            poly[first : last - 1] = PchipInterpolator(t[first:last], v[first:last]).c[::-1].T
    starting = np.append(joined, True)
    return t[starting], poly[starting]


INTERPOLATIONS = {"linear": _lines, "smooth": _smooth}

KIND = Kind(
    "table",
    "values at given times",
    (
        Field("times", "times", "times of the rows, rising", required=True),
        Field("values", "values", "values of the rows", required=True),
        Field(
            "interpolation",
            "choice",
            "straight lines, or a monotone cubic",
            default="linear",
            choices=tuple(INTERPOLATIONS),
        ),
    ),
    build,
)
