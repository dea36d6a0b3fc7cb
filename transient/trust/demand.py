"""Has the accuracy been met?  Each headline number's error beside what the case allows for it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.result.local import local_size
from transient.result.run import Run

# A stress that is this share of the other wall's is judged beside that one: what no motion reaches in the run has no
# relative accuracy of its own.
HARDLY = 1e-6
HISTORY_SHARE = 0.6  # of the accuracy, for stored rows: straight lines between them use the rest
FINAL_SHARE = 0.01  # a final stress is relative to at least this share of the wall's peak
SOON = 1e-5  # of a piece after an infinite stress: from there on the rows must have the local accuracy


@dataclass(frozen=True)
class Demand:
    """One number: its stated ``error`` and what is ``allowed``; ``grazes``: finer steps would not help."""

    name: str
    error: float
    allowed: float
    grazes: bool = False

    @property
    def ratio(self) -> float:
        """Error over allowance (0/0 counts as met)."""
        return 0.0 if self.error == 0.0 else self.error / self.allowed if self.allowed > 0.0 else np.inf


def demands(run: Run, summary: dict[str, Any], accuracy: float, steady_stress: np.ndarray | None) -> list[Demand]:
    """Every headline number that carries an error, and the stored histories."""
    return [
        *_stresses(run, summary, accuracy, steady_stress),
        *_means(run, accuracy),
        *_settlings(run, summary["settling"], accuracy),
        *_bodies(run, summary.get("bodies", {}), accuracy),
        *_pressure(run, summary.get("pressure", {}), accuracy),
    ]


def unmet(wanted: list[Demand]) -> list[Demand]:
    """Those that miss and could be met by a finer solve, worst first."""
    return sorted((d for d in wanted if d.ratio > 1.0 and not d.grazes), key=lambda d: -d.ratio)


def _stresses(
    run: Run, summary: dict[str, Any], accuracy: float, steady_stress: np.ndarray | None
) -> Iterator[Demand]:
    peaks = {wall.name: _peak(run, wall.end) for wall in run.walls}
    largest = max(peaks.values(), default=0.0)
    for wall in run.walls:
        if wall.shear_free:
            continue
        said = summary["walls"][wall.name]
        peak = max(peaks[wall.name], HARDLY * largest)
        if not said["unbounded"]:
            yield Demand(f"{wall.name} peak stress", said["peak_stress_error"] or 0.0, accuracy * peak)
            worst = float(run.errors.stress[~_soon(run), wall.end].max(initial=0.0))
            yield Demand(f"{wall.name} stress history", worst, HISTORY_SHARE * accuracy * peak)
        else:
            worst = _after_infinite(run, run.history.stress[:, wall.end], run.errors.stress[:, wall.end])
            yield Demand(f"{wall.name} stress history", worst, HISTORY_SHARE * accuracy)
        final = abs(said["final_stress"])
        calm = steady_stress is not None and abs(steady_stress[wall.end]) > 1e-6 * peak
        size = max(final, FINAL_SHARE * peak) if calm else max(final, peak)
        yield Demand(f"{wall.name} final stress", said["final_stress_error"], accuracy * max(size, HARDLY * largest))


def _after_infinite(run: Run, value: np.ndarray, error: np.ndarray) -> float:
    """Worst ``error`` (n,) over the local size of ``value`` (n,), but for the very first rows after an infinite one."""
    history = run.history
    asked = np.isfinite(value)
    for start in np.flatnonzero(np.isnan(value)):
        rows = np.flatnonzero(history.piece == history.piece[start])
        asked[rows[history.offset[rows] < SOON * history.offset[rows[-1]]]] = False
    return float((error[asked] / local_size(value)[asked]).max(initial=0.0))


def _soon(run: Run) -> np.ndarray:
    """Rows (n,) so soon after an infinite pressure, which every wall feels at once, that nothing is asked of them."""
    history = run.history
    out = np.zeros(len(history.time), bool)
    for start in np.flatnonzero(np.isnan(history.gradient)):
        rows = np.flatnonzero(history.piece == history.piece[start])
        out[rows[history.offset[rows] < SOON * history.offset[rows[-1]]]] = True
    return out


def _peak(run: Run, end: int) -> float:
    """Largest |stress| of the rows that are finite and, after an infinite stress, no longer near it."""
    stress = np.abs(run.history.stress[:, end])
    if run.unbounded[end] == 0.0:
        return float(np.nanmax(stress, initial=0.0))
    late = run.history.time > run.unbounded_time[end]
    return float(np.nanmedian(stress[late])) if late.any() else 0.0


def _means(run: Run, accuracy: float) -> Iterator[Demand]:
    if run.flow_given:  # the mean is what was asked for, to round-off; of none at all that would be no accuracy
        return
    # a flow that hardly is one, as in a sealed gap, is judged beside the speeds
    lever = run.history.position if run.rotating else 1.0
    moving = float(np.abs(run.history.profile * lever).max(initial=0.0))
    largest = max(float(np.abs(run.history.mean).max(initial=0.0)), HARDLY * moving)
    worst = float(run.errors.mean.max(initial=0.0))
    yield Demand("mean velocity history", worst, HISTORY_SHARE * accuracy * largest)
    yield Demand("peak mean velocity", run.errors.mean_peak, accuracy * largest)


def _settlings(run: Run, said: dict[str, Any], accuracy: float) -> Iterator[Demand]:
    spread = said["errors"]
    rows = [("velocity", "settling time", said["velocity"], spread["velocity"])]
    rows.append(("flow", "flow settling", said["flow"], spread["flow"]))
    rows += [(name, f"{name} stress settling", said["stress"][name], spread["stress"][name]) for name in said["stress"]]
    for key, name, time, error in rows:
        if key == "flow" and run.flow_given:
            continue  # its history is the case's own
        if time is not None and error is not None:
            yield Demand(name, error, accuracy * time, key in said["grazing"])


def _bodies(run: Run, summary: dict[str, Any], accuracy: float) -> Iterator[Demand]:
    names = {wall.end: wall.name for wall in run.walls}
    history, more = run.history, run.errors.more
    if not more:
        return
    later = ~_soon(run)
    for body in run.bodies:
        end, name = body.end, names[body.end]
        for kind, value in (("speed", history.speed[:, end]), ("position", history.place[:, end])):
            error = more["speed" if kind == "speed" else "place"][later, end]
            size = float(np.abs(value).max(initial=0.0))
            yield Demand(f"{name} {kind} history", float(error.max(initial=0.0)), HISTORY_SHARE * accuracy * size)
        said = summary[name]
        if said["peak_acceleration"] is not None and said["peak_acceleration_error"] is not None:
            allowed = accuracy * abs(said["peak_acceleration"])
            yield Demand(f"{name} peak acceleration", said["peak_acceleration_error"], allowed)
        yield from _times(said, name, accuracy)


def _times(said: dict[str, Any], name: str, accuracy: float) -> Iterator[Demand]:
    """A body's settling, and time and distance of its coast-down."""
    if said["speed_settling_time"] is not None and said["speed_settling_error"] is not None:
        allowed = accuracy * said["speed_settling_time"]
        yield Demand(f"{name} speed settling", said["speed_settling_error"], allowed, said["speed_settling_grazes"])
    coast = said["coast_down"]
    if coast is None or coast["time_error"] is None:
        return
    yield Demand(f"{name} coast-down time", coast["time_error"], accuracy * coast["time"], coast["grazes"])
    allowed = accuracy * abs(coast["distance"])
    yield Demand(f"{name} coast-down distance", coast["distance_error"], allowed, coast["grazes"])


def _pressure(run: Run, summary: dict[str, Any], accuracy: float) -> Iterator[Demand]:
    if not run.flow_given or "gradient" not in run.errors.more:
        return
    value, error = run.history.gradient, run.errors.more["gradient"]
    if run.pressure_jump is not None:
        worst = _after_infinite(run, value, error)
        yield Demand("pressure drop history", worst, HISTORY_SHARE * accuracy)
        return
    size = float(np.abs(value).max(initial=0.0))
    yield Demand("pressure drop history", float(error.max(initial=0.0)), HISTORY_SHARE * accuracy * size)
    yield Demand("peak pressure drop", summary["peak_drop_per_length_error"] or 0.0, accuracy * size)
