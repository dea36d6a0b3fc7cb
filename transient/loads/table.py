"""A load at constant steps, as structural programs take it, without losing its peak."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.loads.history import LoadHistory
from transient.loads.load import Load
from transient.result.result import ResultError

MOST_ROWS = 5_000_000
# A row this close to the start or the end of the run, in steps, lies on it: times are rounded.
_ROUNDED = 1e-9


@dataclass(frozen=True, eq=False)
class LoadTable:
    """``time`` (m,) s at constant ``step``, ``value`` (m,); the first row lies ``shift`` after the start of the run.

    ``impulse`` is that of straight lines between the rows, ``impulse_error`` it minus the history's; ``outside`` the
    part of the history's impulse before the first and after the last row.  ``departure`` is the largest difference
    of history and straight lines between the rows (away from infinite instants); ``averaged`` the rows that stand for
    an infinite instant.
    """

    time: np.ndarray
    value: np.ndarray
    step: float
    shift: float
    impulse: float
    impulse_error: float
    outside: float
    departure: float
    averaged: tuple[int, ...]


def table_of(load: Load, step: float) -> LoadTable:
    """The load every ``step`` > 0 seconds, the grid placed so that the peak's instant is a row.

    Where the load is infinite, the nearest row carries the value with which straight lines to its neighbours keep
    the history's impulse; it depends on the step and is no peak.  Raises ResultError for too many rows.
    """
    history = load.history
    time = _grid(history, load.peak_time, step)
    value = history.at(time)
    exact = np.flatnonzero(time == load.peak_time)
    if load.peak is not None and len(exact):
        value[exact] = load.peak
    averaged = tuple(_average(history, time, value, instant.time) for instant in history.infinite)
    impulse = float(np.trapezoid(value, time))
    first, last = history.integral(time[[0, -1]])
    outside = float(first + (history.impulse - last))
    departure = _departure(history, time, value, averaged)
    shift = float(time[0] - history.time[0])
    return LoadTable(time, value, step, shift, impulse, impulse - history.impulse, outside, departure, averaged)


def _grid(history: LoadHistory, anchor: float, step: float) -> np.ndarray:
    """Times (m,) within the history, ``step`` apart, ``anchor`` among them exactly."""
    start, end = float(history.time[0]), float(history.time[-1])
    below, above = (np.floor(span / step + _ROUNDED) for span in (anchor - start, end - anchor))
    if below + above + 1 > MOST_ROWS:
        raise ResultError(
            f"a row every {step:g} s makes {below + above + 1:.3g} rows of this run; at most {MOST_ROWS:g} are "
            f"written, so take {(end - start) / MOST_ROWS:.1g} s or more"
        )
    return np.clip(anchor + step * np.arange(-int(below), int(above) + 1), start, end)


def _average(history: LoadHistory, time: np.ndarray, value: np.ndarray, instant: float) -> int:
    """Fills the row nearest to an infinite instant so that its cells keep the impulse; the row's number."""
    row = int(np.argmin(np.abs(time - instant)))
    low, high = max(row - 1, 0), min(row + 1, len(time) - 1)
    if low == high:
        value[row] = history.impulse / (history.time[-1] - history.time[0])
        return row
    first, last = history.integral(time[[low, high]])
    rest = last - first
    for other in {low, high} - {row}:
        rest -= 0.5 * abs(time[row] - time[other]) * value[other]
    value[row] = 2.0 * rest / (time[high] - time[low])
    return row


def _departure(history: LoadHistory, time: np.ndarray, value: np.ndarray, averaged: tuple[int, ...]) -> float:
    """Largest |history - table| between the rows: both are straight lines, so it lies at a row of the history."""
    apart = np.abs(history.value - np.interp(history.time, time, value))
    seen = (history.time >= time[0]) & (history.time <= time[-1])
    for row in averaged:
        seen &= (history.time < time[max(row - 1, 0)]) | (history.time > time[min(row + 1, len(time) - 1)])
    return float(apart[seen].max(initial=0.0))
