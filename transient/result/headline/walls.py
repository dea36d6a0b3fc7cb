"""Each wall's stress: peak with its time, largest and smallest apart, final value, force or torque."""

from __future__ import annotations

from typing import Any

import numpy as np

from transient.result.run import Run, WallFacts

TIME_MARGIN = 1.1  # the thresholds are crossed by the curve, not by the exact one


def walls(run: Run) -> dict[str, Any]:
    """Summary of every wall by name; all SI."""
    return {wall.name: _wall(run, wall) for wall in run.walls}


def _wall(run: Run, wall: WallFacts) -> dict[str, Any]:
    from transient.result.headline import plain

    history = run.history
    curve = history.stress_curve(wall.end)
    final = float(curve.value[-1])
    final_error = float(run.errors.stress[-1, wall.end])
    infinite = run.unbounded[wall.end] > 0.0
    out: dict[str, Any] = {"peak_stress": None, "peak_stress_error": None, "peak_time": None, "peak_time_error": None}
    peak, at = curve.magnitude()
    largest, largest_at = curve.extreme(1.0)
    smallest, smallest_at = curve.extreme(-1.0)
    if infinite:
        out["peak_time"] = float(run.unbounded_time[wall.end])
        out["peak_time_error"] = 0.0
        push = _side(run, wall.end)
        if push > 0:
            largest = largest_at = np.nan
        else:
            smallest = smallest_at = np.nan
    elif np.isfinite(peak):
        error = float(run.errors.peak[wall.end])
        first = _plateau_start(curve, peak, error, at)
        out |= {"peak_stress": peak, "peak_stress_error": error, "peak_time": first}
        out["peak_time_error"] = _time_error(curve, peak, error, first, run.errors.stress[:, wall.end])
    load = _load_factor(run, wall)
    name = "peak_torque" if run.rotating else "peak_force"
    out |= {
        "error_kind": run.errors.kind,
        "unbounded": bool(infinite),
        "unbounded_coefficient": float(run.unbounded[wall.end]) if infinite else None,
        "unbounded_exponent": 0.5 if infinite else None,
        "final_stress": final,
        "final_stress_error": final_error,
        "final_speed": float(history.speed[-1, wall.end]),
        "largest_stress": plain(largest),
        "largest_time": plain(largest_at),
        "smallest_stress": plain(smallest),
        "smallest_time": plain(smallest_at),
        "overshoot": _overshoot(out["peak_stress"], final),
        "peak_shear_rate": None if out["peak_stress"] is None else abs(out["peak_stress"]) / run.viscosity,
        "travel": float(history.speed_curve(wall.end).integral()[-1]),
        "peak_force": None,
        "peak_torque": None,
        name: None if load is None or out["peak_stress"] is None else load * out["peak_stress"],
    }
    return out


def _side(run: Run, end: int) -> float:
    """Sign of the infinite stress: of the rows just after the jump."""
    value = run.history.stress[:, end]
    after = np.flatnonzero(np.isnan(value))
    later = [value[i + 1] for i in after if i + 1 < len(value) and np.isfinite(value[i + 1])]
    return float(np.sign(max(later, key=abs))) if later else -1.0


def _plateau_start(curve, peak: float, error: float, at: float) -> float:
    """Earliest time at which |stress| is within the peak's error of the peak (the contract's plateau rule)."""
    if peak == 0.0:
        return 0.0
    first = curve.first_at(abs(peak) - error, float(np.sign(peak)))
    return at if np.isnan(first) else min(first, at)


def _time_error(curve, peak: float, error: float, first: float, rows: np.ndarray) -> float:
    """How far the time moves when peak and curve are off by their errors, either way.

    ``rows`` (n,) the curve's own errors: those of all rows that come near the peak count.
    """
    if peak == 0.0:
        return 0.0
    sign = float(np.sign(peak))
    near = sign * curve.value >= abs(peak) - 3.0 * error - 2.0 * float(rows.max(initial=0.0))
    off = error + float(rows[near].max(initial=0.0))
    early = curve.first_at(abs(peak) - error - off, sign)
    late = curve.first_at(abs(peak) - error + off, sign)
    if not np.isfinite(late):  # the top itself is within the errors: so is all of it
        late = curve.last_over(abs(peak) - error - off, sign)
        late = float(curve.time[-1]) if not np.isfinite(late) else late
    return TIME_MARGIN * float(max(first - early, late - first, 0.0))


def _overshoot(peak: float | None, final: float) -> float | None:
    """Share by which the peak exceeds the final value; None where either is missing or the final value is zero."""
    if peak is None or final == 0.0:
        return None
    return abs(peak / final) - 1.0


def _load_factor(run: Run, wall: WallFacts) -> float | None:
    """What turns a stress into the force (or torque) of all gaps on the wall."""
    if wall.area is None:
        return None
    return run.count * wall.area * (wall.radius if run.rotating else 1.0)
