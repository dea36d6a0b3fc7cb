"""One quantity of a result over time, by the name that its table has, and how two of them differ."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.result.result import Result, ResultError
from transient.result.view import nearest


@dataclass(frozen=True, eq=False)
class Trace:
    """``value`` (n,) in SI ``unit`` at ``time`` (n,) s, not falling; ``name`` such as ``wall_stress upper``; ``words``
    name the quantity and ``label`` what it is from.  ``sampled``: nothing is known between the times."""

    name: str
    words: str
    label: str
    unit: str
    time: np.ndarray
    value: np.ndarray
    sampled: bool = False

    def at(self, time: np.ndarray) -> np.ndarray:
        """Values (m,) on straight lines between the finite ones; NaN outside."""
        finite = np.isfinite(self.value)
        return np.interp(time, self.time[finite], self.value[finite], left=np.nan, right=np.nan)


@dataclass(frozen=True, eq=False)
class Difference:
    """Second trace minus first over the time that both cover, ``start`` to ``end`` s, in their unit.

    ``time`` (m,) s and ``apart`` (m,) where the two were held side by side; ``largest`` the signed difference of
    largest magnitude and ``when`` that is; ``rms`` its root mean square over time (of sampled traces: over the
    samples), all None where one of the two becomes infinite; ``size`` the largest magnitude of the first trace;
    ``peak`` and ``peak_time`` of each trace, with its sign, None where it is infinite.
    """

    start: float
    end: float
    time: np.ndarray
    apart: np.ndarray
    largest: float | None
    when: float | None
    rms: float | None
    size: float
    peak: tuple[float | None, float | None]
    peak_time: tuple[float | None, float | None]


def names(result: Result) -> list[str]:
    """Every history of numbers: variables over time, those over walls once for each."""
    out: list[str] = []
    for name, variable in result.variables.items():
        if variable.dims[:1] != ("time",) or name == "time" or variable.data.dtype.kind not in "fiu":
            continue
        if len(variable.dims) == 1:
            out.append(name)
        elif variable.dims[1] == "wall" and "wall" in result.variables:
            out += [f"{name} {wall}" for wall in result.variables["wall"].data]
    return out


def trace_of(result: Result, name: str, label: str = "") -> Trace:
    """The history ``name``, such as ``mean_velocity`` or ``wall_stress upper``; a single wall may be left out.

    Raises ResultError where there is none of that name.
    """
    known = names(result)
    short, _, wall = name.partition(" ")
    of_name = [one for one in known if one.partition(" ")[0] == short]
    if name not in known and not wall and len(of_name) == 1:
        name, wall = of_name[0], of_name[0].partition(" ")[2]
    if name not in known:
        if of_name:
            raise ResultError(f"which wall? there are {' and '.join(repr(one) for one in of_name)}")
        raise ResultError(f"a result has no history {name!r}{nearest(name, known)}")
    variable = result.variables[short]
    column = variable.data
    if wall:
        column = column[:, [str(w) for w in result.variables["wall"].data].index(wall)]
    words = variable.long_name + (f", {wall}" if wall else "")
    return Trace(name, words, label or result.title, variable.units, result.time, column)


def difference(first: Trace, second: Trace) -> Difference:
    """How ``second`` departs from ``first``.  Raises ResultError where they share no time or unit."""
    if first.unit != second.unit:
        raise ResultError(f"{second.label} is in {second.unit}, {first.label} in {first.unit}; they do not compare")
    start = max(_span(first)[0], _span(second)[0])
    end = min(_span(first)[1], _span(second)[1])
    if not end > start:
        raise ResultError(f"{first.label} and {second.label} share no time")
    time = _instants(first, second)
    time = time[(time >= start) & (time <= end)]
    if not (first.sampled or second.sampled):
        time = np.unique(np.concatenate([time, [start, end]]))
    if len(time) == 0:
        raise ResultError(f"{first.label} and {second.label} share no time")
    one, two = first.at(time), second.at(time)
    apart = two - one
    row = int(np.argmax(np.abs(apart)))
    infinite = [_infinite(trace, start, end) for trace in (first, second)]
    peaks = [_peak(time, values) if not far else (None, None) for values, far in zip((one, two), infinite, strict=True)]
    stated: tuple[float | None, ...] = (None, None, None)
    if not any(infinite):
        rms = _rms(time, apart, first.sampled or second.sampled)
        stated = (float(apart[row]), float(time[row]), rms)
    size = float(np.abs(one).max())
    return Difference(start, end, time, apart, *stated, size, *zip(*peaks, strict=True))


def _peak(time: np.ndarray, values: np.ndarray) -> tuple[float, float]:
    row = int(np.argmax(np.abs(values)))
    return float(values[row]), float(time[row])


def _instants(first: Trace, second: Trace) -> np.ndarray:
    """Samples where there are such, else every row of both: straight lines differ most at one of them."""
    if second.sampled:
        return second.time
    return first.time if first.sampled else np.union1d(first.time, second.time)


def _rms(time: np.ndarray, apart: np.ndarray, sampled: bool) -> float:
    """Root mean square; between rows the square of a straight line, integrated exactly."""
    if sampled:
        return float(np.sqrt(np.mean(apart**2)))
    left, right = apart[:-1], apart[1:]
    part = np.diff(time) * (left * left + left * right + right * right) / 3.0
    return float(np.sqrt(part.sum() / (time[-1] - time[0])))


def _infinite(trace: Trace, start: float, end: float) -> bool:
    inside = (trace.time >= start) & (trace.time <= end)
    # an infinite value in the first row lies at the start of what is finite
    return bool((~np.isfinite(trace.value[inside])).any() or not np.isfinite(trace.value[0]))


def _span(trace: Trace) -> tuple[float, float]:
    finite = trace.time[np.isfinite(trace.value)]
    if len(finite) == 0:
        raise ResultError(f"{trace.label} holds no numbers")
    return float(finite[0]), float(finite[-1])
