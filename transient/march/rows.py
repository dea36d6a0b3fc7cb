"""Which rows a result keeps: dense enough that straight lines between them are within the accuracy."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.grid import spacing
from transient.gap.problem import LOWER, PRESSURE, UPPER, Inputs, Problem
from transient.march.rates import accelerations
from transient.result.curve import Curve
from transient.result.history import History
from transient.result.local import local_size

STRAIGHT = 0.35  # share of the accuracy that a straight line may be off
LEADING = 0.6  # share of the local stress's accuracy that rows after an infinite stress must have
YOUNG = 1e-3  # of a piece after an infinite stress: where rows may be left out
MOST_ROWS = 1_000_000
MOST_PARTS = 4096
UNMOVED = 1e-10  # of the largest velocity: changes that add up to less over a run are round-off
SMOOTH = 80  # intervals across the gap of a stored profile, at least


@dataclass(frozen=True, eq=False)
class Motion:
    """How walls and their bodies move: ``place``, ``acceleration`` (n, 2), the latter NaN where a body's is infinite,
    and ``load`` (n, 2) on the bodies, their speed-dependent part left out (0 without a body)."""

    place: np.ndarray
    acceleration: np.ndarray
    load: np.ndarray


@dataclass(frozen=True, eq=False)
class Rows:
    """Histories as stored: ``time`` (n,) s rising; ``stress``, ``speed`` (n, 2); ``mean``, ``gradient`` (n,);
    ``motion`` where a wall carries a body."""

    time: np.ndarray
    stress: np.ndarray
    speed: np.ndarray
    mean: np.ndarray
    gradient: np.ndarray
    motion: Motion | None = None


def stored(problem: Problem, history: History, inputs: Inputs, stress_error: np.ndarray) -> Rows:
    """Rows of ``history``, filled in where a straight line would be off, without those that are not needed.

    A finite jump of an input is two rows at neighbouring times, an infinite stress one row of NaN.  Rows so soon
    after an infinite stress that their error (``stress_error`` (n, 2)) exceeds the local accuracy are left out.
    """
    accuracy = problem.accuracy
    keep = _trusted(history, accuracy, stress_error)
    pairs = np.flatnonzero(keep)
    low, high = pairs[:-1], pairs[1:]
    same = history.piece[low] == history.piece[high]
    low, high = low[same], high[same]
    parts = _parts(problem, history, inputs, low, high)
    inner = np.repeat(np.arange(len(low)), parts - 1)
    number = np.arange(len(inner)) - np.repeat(np.cumsum(parts - 1) - (parts - 1), parts - 1) + 1
    share = number / parts[inner]
    piece = history.piece[low][inner]
    passed = _pairs(history, low, high).passed(2 * inner, share)
    offset = history.offset[low][inner] + passed

    def fill(value: np.ndarray, rate: np.ndarray) -> np.ndarray:
        joined = _pairs(history, low, high, value, rate)
        return np.concatenate([value[pairs], joined.at(2 * inner, joined.share_of(2 * inner, passed))])

    stress = np.stack([fill(history.stress[:, end], history.stress_rate[:, end]) for end in (0, 1)], axis=1)
    mean = fill(history.mean, history.mean_rate)
    pieces = np.concatenate([history.piece[pairs], piece])
    offsets = np.concatenate([history.offset[pairs], offset])
    order = np.lexsort((offsets, pieces))
    pieces, offsets, stress, mean = pieces[order], offsets[order], stress[order], mean[order]
    speed = np.stack([inputs.row(end).at(pieces, offsets) for end in (LOWER, UPPER)], axis=1)
    gradient = inputs.row(PRESSURE).at(pieces, offsets)
    ends = [end for end, wall in enumerate(problem.walls) if wall.body is not None]
    motion = None
    if ends:
        motion = Motion(
            np.stack([fill(history.place[:, end], history.speed[:, end])[order] for end in (LOWER, UPPER)], axis=1),
            np.stack([inputs.row(end).at(pieces, offsets, 1) for end in (LOWER, UPPER)], axis=1),
            np.zeros_like(speed),
        )
        for end in ends:
            motion.load[:, end] = speed[:, end]
            speed[:, end] = fill(history.speed[:, end], history.acceleration[:, end])[order]
            motion.acceleration[:, end] = fill(*accelerations(problem, inputs, history, end))[order]
    if problem.flow is not None:
        gradient = fill(history.gradient, history.gradient_rate)[order]
    time = inputs.starts[pieces] + offsets
    return _part_jumps(Rows(time, stress, speed, mean, gradient, motion), pieces)


def _pairs(
    history: History, low: np.ndarray, high: np.ndarray, value: np.ndarray | None = None, rate: np.ndarray | None = None
) -> Curve:
    """A curve whose even intervals are those from rows ``low`` to rows ``high``, one after the other."""

    def weave(of: np.ndarray) -> np.ndarray:
        return np.stack([of[low], of[high]], axis=1).ravel()

    step = history.offset[high] - history.offset[low]
    begins = history.offset[low]
    nothing = np.zeros(len(history.time))
    if value is not None and rate is not None:
        whole = Curve(history.time, value, rate, history.step, history.offset[:-1])
        begins = np.where(high == low + 1, whole.measure[low], begins)
    return Curve(
        np.zeros(2 * len(low)),
        weave(nothing if value is None else value),
        weave(nothing if rate is None else rate),
        np.stack([step, np.zeros_like(step)], axis=1).ravel()[:-1],
        np.stack([begins, np.zeros_like(step)], axis=1).ravel()[:-1],
    )


def _trusted(history: History, accuracy: float, error: np.ndarray) -> np.ndarray:
    """Rows to keep (n,): all but those that follow an infinite stress, or the infinite pressure of a prescribed flow,
    up to the last that is not yet accurate.

    The row at the next break stays in any case.
    """
    keep = np.ones(len(history.time), bool)
    for end in (0, 1):
        bad = error[:, end] > LEADING * accuracy * np.abs(history.stress[:, end])
        for start in np.flatnonzero(np.isnan(history.stress[:, end]) | np.isnan(history.gradient)):
            rows = np.flatnonzero(history.piece == history.piece[start])
            rows = rows[(rows > start) & (rows < rows[-1])]
            young = rows[history.offset[rows] < YOUNG * history.offset[rows[-1]]] if len(rows) else rows
            if bad[young].any():
                keep[young[: int(np.flatnonzero(bad[young])[-1]) + 1]] = False
    return keep


def _parts(problem: Problem, history: History, inputs: Inputs, low: np.ndarray, high: np.ndarray) -> np.ndarray:
    """Into how many parts each kept interval is cut (m,)."""
    accuracy = problem.accuracy
    step = history.offset[high] - history.offset[low]
    need = np.zeros(len(low))
    columns = [
        *((history.stress[:, end], history.stress_rate[:, end]) for end in (0, 1)),
        (history.mean, history.mean_rate),
    ]
    given = [PRESSURE] if problem.flow is None else []
    if problem.flow is not None:
        columns.append((history.gradient, history.gradient_rate))
    for end, wall in enumerate(problem.walls):
        if wall.body is None:
            given.append(end)
        else:
            columns.append((history.speed[:, end], history.acceleration[:, end]))
            columns.append(accelerations(problem, inputs, history, end))
    for value, rate in columns:
        size = np.nanmax(np.abs(value), initial=0.0)
        scale = np.full(len(low), size)
        if np.isnan(value).any():
            local = local_size(value)
            scale = np.maximum(local[low], local[high])
            scale = np.where(np.isfinite(scale), scale, np.inf)
        curve = _pairs(history, low, high, value, rate)
        even = 2 * np.arange(len(low))
        off = np.zeros(len(low))
        for part in (0.25, 0.5, 0.75):
            share = np.full(len(low), part)
            with np.errstate(all="ignore"):
                along = curve.passed(even, share) / np.where(step > 0, step, 1.0)
                line = value[low] + along * (value[high] - value[low])
                off = np.fmax(off, np.abs(curve.at(even, share) - line))
        with np.errstate(all="ignore"):
            bend = 1.1 * off / (STRAIGHT * accuracy * scale)
        need = np.maximum(need, np.where(np.isfinite(bend), bend, 0.0))
    for index in given:
        row = inputs.row(index)
        size = np.abs(row.at(history.piece, history.offset)).max(initial=0.0)
        if size == 0.0:
            continue
        for share in (0.0, 0.5, 1.0):
            bend = np.abs(row.at(history.piece[low], history.offset[low] + share * step, 2)) * step**2 / 8.0
            need = np.maximum(need, bend / (STRAIGHT * accuracy * size))
    # right at a break the curve is a root: there twice as many parts only halve the error
    parts = np.clip(np.ceil(np.where(history.offset[low] == 0.0, need, np.sqrt(need))), 1, MOST_PARTS)
    parts[np.isnan(history.stress[low]).any(axis=1)] = 1  # or an infinite stress would spread over rows of its own
    if parts.sum() > MOST_ROWS:
        parts = np.maximum(np.floor(parts * (MOST_ROWS / parts.sum())), 1)
    return parts.astype(int)


def _part_jumps(rows: Rows, piece: np.ndarray) -> Rows:
    """Make times rise: breaks without a jump become one row, the others two at neighbouring times."""
    time = rows.time.copy()
    enters = np.flatnonzero(piece[1:] != piece[:-1])  # last row of its piece
    moved = [] if rows.motion is None else [rows.motion.acceleration, rows.motion.load]
    values = np.concatenate([rows.stress, rows.speed, rows.gradient[:, None], *moved], axis=1)
    left, right = values[enters], values[enters + 1]
    with np.errstate(invalid="ignore"):
        size = np.nanmax(np.abs(values), axis=0, initial=0.0)
        jumps = (np.abs(right - left) > 1e-9 * size).any(axis=1) | (np.isnan(right) & ~np.isnan(left)).any(axis=1)
    time[enters] = time[enters + 1]
    time[enters[jumps]] = np.nextafter(time[enters[jumps] + 1], -np.inf)
    keep = np.ones(len(time), bool)
    keep[enters[~jumps]] = False
    index = np.flatnonzero(keep)
    highest = np.maximum.accumulate(time[index])
    rising = np.append(True, time[index][1:] > highest[:-1])
    # a row lost to the resolution of the time axis must not be the one that says a stress was infinite
    index = index[rising | np.isnan(rows.stress[index]).any(axis=1)]
    index = index[np.append(True, np.diff(time[index]) > 0)]
    motion = rows.motion
    if motion is not None:
        motion = Motion(motion.place[index], motion.acceleration[index], motion.load[index])
    return Rows(time[index], rows.stress[index], rows.speed[index], rows.mean[index], rows.gradient[index], motion)


def denser(problem: Problem, layers: tuple[float, float], cells: int) -> tuple[int, np.ndarray]:
    """(parts, coordinates (cells x parts + 1,)): each interval of a grid cut so that a drawn profile looks smooth."""
    parts = 1
    while cells * parts < SMOOTH:
        parts *= 2
    low, high = spacing(cells * parts, *layers)
    return parts, np.where(low < 0.5, problem.inner + problem.gap * low, problem.outer - problem.gap * high)


def profile_times(history: History, count: int) -> np.ndarray:
    """``count`` instants (at most) at which the profile has changed by equal amounts, ends included."""
    kept = history.time[history.profile_row]
    change = np.abs(np.diff(history.profile, axis=0)).max(axis=1)
    moved = np.concatenate([[0.0], np.cumsum(change)])
    span = kept[-1] - kept[0]
    measure = moved / moved[-1] if moved[-1] > UNMOVED * np.abs(history.profile).max() else np.zeros_like(moved)
    measure = 0.85 * measure + 0.15 * (kept - kept[0]) / span
    rising = np.append(True, np.diff(measure) > 0)
    wanted = np.interp(np.linspace(0.0, measure[-1], count), measure[rising], kept[rising])
    wanted[0], wanted[-1] = kept[0], kept[-1]
    return np.unique(wanted)
