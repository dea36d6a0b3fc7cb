"""Time histories: what drives a wall or the pressure, compiled to pieces of one closed form.

One file and one entry in ``KINDS`` per history kind.
"""

from __future__ import annotations

from transient.drive import (
    half_sine,
    lag,
    ramp,
    repeat,
    s_curve,
    sine,
    smooth_ramp,
    step,
    sum,
    table,
    trapezoid,
)
from transient.drive.kind import Kind

KINDS: dict[str, Kind] = {
    module.KIND.name: module.KIND
    for module in (
        step,
        ramp,
        smooth_ramp,
        s_curve,
        trapezoid,
        lag,
        sine,
        half_sine,
        table,
        sum,
        repeat,
    )
}
