"""The load on one wall of a finished result: which history, its true peak, and what it was before the run."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.loads.history import Infinite, LoadHistory
from transient.result.result import Result, ResultError

# What serves as the load, in order of preference, and its word.
QUANTITIES = {"wall_force": "force", "wall_torque": "torque", "wall_stress": "stress"}
# The summary's law of an infinite stress is used where the first row after the instant agrees within this share.
_LAW_AGREES = 0.05
# The summary's extremes are used where the stored rows agree with them within this many times the accuracy.
_ROWS_AGREE = 3.0
_USUAL_ACCURACY = 1e-3


@dataclass(frozen=True, eq=False)
class Load:
    """The load history of one wall, SI.

    ``variable`` the result's variable, ``quantity`` "force", "torque" or "stress", with its ``unit``; ``before`` the
    load just before t = 0; ``peak`` the value of largest magnitude (None where infinite) at ``peak_time``, with the
    run's bound of its error where stated; ``period`` of the state that the run ends in, or None; ``verdict`` of the
    run on itself, or None.
    """

    title: str
    wall: str
    variable: str
    quantity: str
    unit: str
    history: LoadHistory
    before: float
    peak: float | None
    peak_time: float
    peak_error: float | None
    period: float | None
    verdict: str | None

    @property
    def impulse_unit(self) -> str:
        """Unit of the load's integral over time."""
        return f"{self.unit}*s"


def load_of(result: Result, wall: str | None = None) -> Load:
    """The load on ``wall`` (may be left out where there is one): force or torque, stress where no area is known.

    Raises ResultError where the result holds no such history or no such wall.
    """
    if "case" in result.variables:
        raise ResultError("loads are those of a single run, and this file holds a sweep; run the case of interest")
    variable = next((name for name in QUANTITIES if name in result.variables), None)
    missing = [name for name in ("time", "wall") if name not in result.variables]
    if variable is None or missing:
        raise ResultError(f"the result holds no {missing[0] if missing else 'wall stress'}; run the case again")
    name, column = _chosen(result, wall)
    time = np.asarray(result.time, float)
    rows = np.asarray(result.variables[variable].data[:, column], float)
    if len(time) < 2 or not np.isfinite(time).all() or (np.diff(time) < 0.0).any():
        raise ResultError("the result's times do not rise; run the case again")
    numbers = (result.summary.get("walls") or {}).get(name) or {}
    factor = _factor(result, rows, column)
    before = _before(result, numbers, factor, rows)
    history = _history(time, rows, before, numbers, factor)
    history, peak, peak_time, error = _with_peak(history, result, numbers, factor)
    period = (result.summary.get("settling") or {}).get("period")
    unit, verdict = result.variables[variable].units, result.summary.get("verdict")
    word = QUANTITIES[variable]
    return Load(
        result.title, name, variable, word, unit, history, before, peak, peak_time, error, period, verdict
    )


def _chosen(result: Result, wall: str | None) -> tuple[str, int]:
    """(name, column) of the wall asked for."""
    names = [str(name) for name in result.variables["wall"].data]
    known = " and ".join(names)
    if wall is None:
        if len(names) != 1:
            raise ResultError(f"which wall? the result has {known}; choose with --wall {names[-1]}")
        return names[0], 0
    if wall not in names:
        raise ResultError(f'there is no wall "{wall}"; the result has {known}')
    return wall, names.index(wall)


def _factor(result: Result, rows: np.ndarray, column: int) -> float | None:
    """What turns this wall's stress into the load; None where the two histories are not proportional."""
    if "wall_stress" not in result.variables:
        return None
    stress = np.asarray(result.wall_stress[:, column], float)
    finite = np.isfinite(stress) & np.isfinite(rows)
    if not finite.any():
        return None
    largest = int(np.argmax(np.where(finite, np.abs(stress), -1.0)))
    if stress[largest] == 0.0:
        return None
    factor = float(rows[largest] / stress[largest])
    same = np.allclose(rows[finite], factor * stress[finite], rtol=1e-9, atol=1e-12 * abs(rows[largest]))
    return factor if same else None


def _before(result: Result, numbers: dict[str, Any], factor: float | None, rows: np.ndarray) -> float:
    """The load just before t = 0: none from rest, else that of the steady flow before."""
    try:
        case = tomllib.loads(result.case_text)
    except tomllib.TOMLDecodeError:
        raise ResultError("the result is damaged: the case inside is not readable") from None
    start = case.get("start")
    if not isinstance(start, dict) or start.get("state", "rest") != "steady":
        return 0.0
    if factor is not None and isinstance(numbers.get("initial_stress"), float):
        return factor * numbers["initial_stress"]
    return float(rows[0]) if np.isfinite(rows[0]) else 0.0


def _history(
    time: np.ndarray, rows: np.ndarray, before: float, numbers: dict[str, Any], factor: float | None
) -> LoadHistory:
    """Straight lines between finite rows; after a row that is not finite the law of an infinite stress."""
    value = rows.copy()
    infinite = []
    exponent = float(numbers.get("unbounded_exponent") or 0.5)
    law = numbers.get("unbounded_coefficient")
    stated = None if law is None or factor is None else abs(law * factor)
    for row in np.flatnonzero(~np.isfinite(rows)):
        value[row] = value[row - 1] if row > 0 else before
        coefficient = rest = 0.0
        if row + 1 < len(rows) and np.isfinite(rows[row + 1]):
            since = time[row + 1] - time[row]
            coefficient = rows[row + 1] * since**exponent
            if stated is not None and abs(stated - abs(coefficient)) <= _LAW_AGREES * stated:
                coefficient = float(np.copysign(stated, coefficient))
                rest = rows[row + 1] - coefficient / since**exponent
        infinite.append(Infinite(int(row), float(time[row]), float(coefficient), exponent, float(rest)))
    return LoadHistory(time, value, tuple(infinite))


def _with_peak(
    history: LoadHistory, result: Result, numbers: dict[str, Any], factor: float | None
) -> tuple[LoadHistory, float | None, float, float | None]:
    """The history with the extremes that lie between stored rows made rows of it; its peak, the peak's time, and
    the stated bound of its error.
    """
    if history.infinite:
        return history, None, max(history.infinite, key=lambda instant: abs(instant.coefficient)).time, None
    top = int(np.argmax(np.abs(history.value)))
    peak, peak_time, error = float(history.value[top]), float(history.time[top]), None
    if factor is None:
        return history, peak, peak_time, error
    accuracy = (result.summary.get("accuracy") or {}).get("asked") or _USUAL_ACCURACY
    room = _ROWS_AGREE * accuracy * abs(peak)
    for kind in ("smallest", "largest", "peak"):
        when, stress = numbers.get(f"{kind}_time"), numbers.get(f"{kind}_stress")
        if when is None or stress is None or not history.time[0] <= when <= history.time[-1]:
            continue
        value = stress * factor
        if abs(float(np.interp(when, history.time, history.value)) - value) > room:
            continue
        if kind == "peak":
            if abs(value) < np.abs(history.value).max() * (1.0 - _ROWS_AGREE * accuracy):
                continue
            peak, peak_time = value, float(when)
            stated = numbers.get("peak_stress_error")
            error = None if stated is None else abs(factor * stated)
        history = _insert(history, float(when), value)
    return history, peak, peak_time, error


def _insert(history: LoadHistory, time: float, value: float) -> LoadHistory:
    row = int(np.searchsorted(history.time, time))
    if history.time[row] == time:
        values = history.value.copy()
        values[row] = value
        return LoadHistory(history.time, values)
    return LoadHistory(np.insert(history.time, row, time), np.insert(history.value, row, value))
