"""The pressure drop per length: prescribed, so its numbers are the drive's own."""

from __future__ import annotations

from typing import Any

import numpy as np

from transient.result.run import Run


def pressure(run: Run) -> dict[str, Any]:
    """Largest magnitude (signed) over the rows and the final value, Pa/m."""
    drop = run.history.gradient
    peak = int(np.abs(drop).argmax())
    return {
        "peak_drop_per_length": float(drop[peak]),
        "peak_time": float(run.history.time[peak]),
        "final_drop_per_length": float(drop[-1]),
    }
