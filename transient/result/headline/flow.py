"""Mean velocity, flow rate and the volume delivered."""

from __future__ import annotations

from typing import Any

from transient.result.run import Run


def flow(run: Run) -> dict[str, Any]:
    """Summary of the flow through the section; the rate and the volume are those of all gaps together."""
    curve = run.history.mean_curve()
    peak, at = curve.magnitude()
    section = None if run.section is None else run.section * run.count
    distance = float(curve.integral()[-1])
    return {
        "peak_mean_velocity": peak,
        "peak_mean_velocity_error": float(run.errors.mean_peak),
        "peak_time": at,
        "final_mean_velocity": float(curve.value[-1]),
        "final_mean_velocity_error": float(run.errors.mean[-1]),
        "error_kind": run.errors.kind,
        "peak_flow_rate": None if section is None else peak * section,
        "final_flow_rate": None if section is None else float(curve.value[-1]) * section,
        "mean_travel": distance,
        "volume_delivered": None if section is None else distance * section,
    }
