"""Time histories of many rows at once: the pieces of ``drive``'s kinds with arrays for numbers.

A drive's rows are pieces [rows or 1, P] as in ``drive.piecewise``, with at most one wave each; pieces without length
stand where a row has fewer.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from transient.drive.kind import Kind
from transient.drive.pieces import Drive
from transient.drive.times import SAME_TIME
from transient.march.regime import last_features

ENDLESS = 1e300
MOST_PIECES = 400
Numbers = Mapping[str, np.ndarray]


@dataclass(frozen=True, eq=False)
class DriveRows:
    """``starts`` [n, P] s; ``poly`` [n, P, 4]; ``wave`` [n, P, 4] real and imaginary part of coefficient and rate;
    (n,) each: the value ``before`` t = 0, the one it ends in, the last break's time, the slowest time constant after
    it (s), and whether the row is one that the case room would refuse.  n is 1 where all rows share the drive."""

    starts: np.ndarray
    poly: np.ndarray
    wave: np.ndarray
    before: np.ndarray
    end: np.ndarray
    last: np.ndarray
    lag: np.ndarray
    bad: np.ndarray

    def scaled(self, factor: np.ndarray) -> DriveRows:
        """Every row times its factor (n,)."""
        wave = np.broadcast_to(self.wave, (len(factor), *self.wave.shape[1:])).copy()
        wave[:, :, :2] *= factor[:, None, None]
        rows = len(factor)
        spread = [np.broadcast_to(of, (rows,)).copy() for of in (self.last, self.lag, self.bad)]
        starts = np.broadcast_to(self.starts, (rows, self.starts.shape[1])).copy()
        return DriveRows(
            starts, self.poly * factor[:, None, None], wave, self.before * factor, self.end * factor, *spread
        )


def shared(drive: Drive) -> DriveRows | None:
    """One drive for all rows; None where it ends in no constant or has more than one wave at a time."""
    end = drive.eventual
    if end.drive is None or end.period is not None:
        return None
    pieces = drive.pieces(ENDLESS)
    if pieces.coeff.shape[1] > 1 or len(pieces.starts) > MOST_PIECES:
        return None
    wave = np.zeros((1, len(pieces.starts), 4))
    if pieces.coeff.shape[1]:
        coeff, rate = pieces.coeff[:, 0], pieces.rate[:, 0]
        wave[0] = np.stack([coeff.real, coeff.imag, rate.real, rate.imag], axis=1)
    value = float(end.drive.pieces(1.0).value(np.zeros(1))[0])
    last, lag = last_features(drive)
    numbers = [np.array([x]) for x in (drive.before, value, last, lag)]
    return DriveRows(pieces.starts[None], pieces.poly[None], wave, *numbers, np.zeros(1, bool))


def held(value: np.ndarray) -> DriveRows:
    """Held at ``value`` (n,) from t = 0 on, and, where the start is steady, before."""
    return _rows([np.zeros_like(value)], [[value]], value, value, np.zeros_like(value))


def _rows(
    starts: list[np.ndarray],
    poly: list[list[np.ndarray]],
    before: np.ndarray,
    end: np.ndarray,
    last: np.ndarray,
    waves: Mapping[int, tuple[np.ndarray, ...]] | None = None,
    lag: np.ndarray | None = None,
) -> DriveRows:
    """Pieces laid side by side; those that begin at 0 besides the first are told by ``starts``."""
    n = len(before)
    at = np.stack(starts, axis=1)
    cubic = np.zeros((n, len(starts), 4))
    for p, row in enumerate(poly):
        for k, number in enumerate(row):
            cubic[:, p, k] = number
    wave = np.zeros((n, len(starts), 4))
    for p, parts in (waves or {}).items():
        for k, number in enumerate(parts):
            wave[:, p, k] = number
    length = np.diff(at, axis=1)
    with np.errstate(invalid="ignore"):
        short = ((length > 0.0) & (length <= 2.0 * SAME_TIME * at[:, 1:])).any(axis=1)
        bad = short | ~np.isfinite(at).all(axis=1) | ~np.isfinite(cubic).all(axis=(1, 2)) | (at < 0.0).any(axis=1)
        bad |= (length < 0.0).any(axis=1)
    still = end == before if waves is None and len(starts) == 2 else np.zeros(n, bool)
    return DriveRows(
        at, cubic, wave, before, end, np.where(still, 0.0, last), np.zeros(n) if lag is None else lag, bad
    )


def _step(v: Numbers) -> DriveRows:
    zero = np.zeros_like(v["to"])
    return _rows([zero, v["at"]], [[v["from"]], [v["to"]]], v["from"], v["to"], v["at"])


def _ramp(v: Numbers) -> DriveRows:
    zero, stop = np.zeros_like(v["to"]), v["at"] + v["over"]
    slope = (v["to"] - v["from"]) / v["over"]
    return _level(v, _rows(
        [zero, v["at"], stop], [[v["from"]], [v["from"], slope], [v["to"]]], v["from"], v["to"], stop
    ))  # fmt: skip


def _level(v: Numbers, rows: DriveRows) -> DriveRows:
    """A change from a value to itself is none."""
    last = np.where(v["to"] == v["from"], 0.0, rows.last)
    lag = np.where(v["to"] == v["from"], 0.0, rows.lag)
    return DriveRows(rows.starts, rows.poly, rows.wave, rows.before, rows.end, last, lag, rows.bad)


def _smooth_ramp(v: Numbers) -> DriveRows:
    zero, stop = np.zeros_like(v["to"]), v["at"] + v["over"]
    half = 0.5 * (v["to"] - v["from"])
    wave = {1: (-half, zero, zero, math.pi / v["over"])}
    poly = [[v["from"]], [v["from"] + half], [v["to"]]]
    return _level(v, _rows([zero, v["at"], stop], poly, v["from"], v["to"], stop, wave))


def _lag(v: Numbers) -> DriveRows:
    zero = np.zeros_like(v["to"])
    wave = {1: (v["from"] - v["to"], zero, -1.0 / v["time_constant"], zero)}
    poly = [[v["from"]], [v["to"]]]
    return _level(v, _rows([zero, v["at"]], poly, v["from"], v["to"], v["at"], wave, v["time_constant"]))


def _trapezoid(v: Numbers) -> DriveRows:
    zero, change = np.zeros_like(v["to"]), v["to"] - v["from"]
    starts = [zero, v["at"]]
    for part in ("rise", "hold", "fall"):
        starts.append(starts[-1] + v[part])
    with np.errstate(divide="ignore", invalid="ignore"):
        up = np.where(v["rise"] > 0.0, change / v["rise"], 0.0)
        down = np.where(v["fall"] > 0.0, -change / v["fall"], 0.0)
    poly = [[v["from"]], [v["from"], up], [v["to"]], [v["to"], down], [v["from"]]]
    return _level(v, _rows(starts, poly, v["from"], v["from"], starts[-1]))


def _s_curve(v: Numbers) -> DriveRows:
    zero, change = np.zeros_like(v["to"]), np.abs(v["to"] - v["from"])
    sign = np.where(v["to"] < v["from"], -1.0, 1.0)
    build_up = np.minimum(v["acceleration"] / v["jerk"], np.sqrt(change / v["jerk"]))
    slope, curve = sign * v["jerk"] * build_up, 0.5 * sign * v["jerk"]
    gain = 0.5 * slope * build_up
    with np.errstate(divide="ignore", invalid="ignore"):
        straight = np.where(change > 0.0, np.maximum(change / np.abs(slope) - build_up, 0.0), 0.0)
    straight = np.where(straight > 1e-12 * build_up, straight, 0.0)
    starts = [zero, v["at"]]
    for part in (build_up, straight, build_up):
        starts.append(starts[-1] + part)
    fall = [v["to"] - gain, slope, -curve]
    poly = [[v["from"]], [v["from"], zero, curve], [v["from"] + gain, slope], fall, [v["to"]]]
    return _level(v, _rows(starts, poly, v["from"], v["to"], starts[-1]))


def _half_sine(v: Numbers) -> DriveRows:
    zero, stop = np.zeros_like(v["amplitude"]), v["at"] + v["over"]
    wave = {1: (zero, -v["amplitude"], zero, math.pi / v["over"])}
    return _rows([zero, v["at"], stop], [[zero], [zero], [zero]], zero, zero, stop, wave)


# The kinds whose numbers may vary from row to row; the others may be there as long as all rows share them.
BUILDERS: dict[str, Callable[[Numbers], DriveRows]] = {
    "step": _step,
    "ramp": _ramp,
    "smooth_ramp": _smooth_ramp,
    "lag": _lag,
    "trapezoid": _trapezoid,
    "s_curve": _s_curve,
    "half_sine": _half_sine,
}
# What ``build`` refuses below or at zero, by the name of the number.
_POSITIVE = ("over", "time_constant", "acceleration", "jerk")


def varied(kind: Kind, numbers: Numbers) -> DriveRows:
    """A kind's rows from its numbers (n,) in SI, defaults included."""
    bad = np.zeros(len(next(iter(numbers.values()))), bool)
    for name, number in numbers.items():
        field = next(field for field in kind.fields if field.name == name)
        bad |= ~np.isfinite(number)
        if name in _POSITIVE:
            bad |= ~(number > 0.0)
        elif field.quantity == "time":
            bad |= ~(number >= 0.0)
    safe = {name: np.where(bad, 1.0, number) for name, number in numbers.items()}
    rows = BUILDERS[kind.name](safe)
    return DriveRows(
        rows.starts, rows.poly, rows.wave, rows.before, rows.end, rows.last, rows.lag, rows.bad | bad
    )
