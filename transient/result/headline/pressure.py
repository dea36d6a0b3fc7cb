"""The pressure drop per length: the drive's own numbers, or, where the flow is prescribed, a result with its error."""

from __future__ import annotations

from typing import Any

import numpy as np

from transient.result.run import Run


def pressure(run: Run) -> dict[str, Any]:
    """Largest magnitude (signed) and final value, Pa/m.

    The peak is found between the rows too.  Where a flow is prescribed and the pressure is infinite at some instant (a
    sudden change of the flow, or of a wall's speed in it) ``unbounded`` says so, there is no peak and ``peak_time`` is
    that instant.
    """
    return _result(run) if run.flow_given else _given(run)


def _given(run: Run) -> dict[str, Any]:
    peak, at = run.history.gradient_curve().magnitude()
    return {
        "peak_drop_per_length": peak,
        "peak_time": at,
        "final_drop_per_length": float(run.history.gradient[-1]),
    }


def _result(run: Run) -> dict[str, Any]:
    curve = run.history.gradient_curve()
    peak, at = curve.magnitude()
    error = run.errors.more.get("gradient")
    infinite = run.pressure_jump is not None
    beside = np.clip(np.searchsorted(curve.time, at) + np.arange(-1, 2), 0, len(curve.time) - 1)
    return {
        "peak_drop_per_length": None if infinite else peak,
        "peak_drop_per_length_error": None if infinite or error is None else float(error[beside].max()),
        "peak_time": run.pressure_jump if infinite else at,
        "unbounded": infinite,
        "final_drop_per_length": float(curve.value[-1]),
        "final_drop_per_length_error": None if error is None else float(error[-1]),
        "error_kind": run.errors.kind,
    }
