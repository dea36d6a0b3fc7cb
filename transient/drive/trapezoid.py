"""Up, hold, and back."""

from __future__ import annotations

import numpy as np

from transient.drive.assemble import held, once, require_finite, require_not_negative
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, DriveError, constant


def build(to: float, rise: float, hold: float, fall: float, from_: float = 0.0, at: float = 0.0) -> Drive:
    """Straight from ``from_`` to ``to`` during ``rise``, held during ``hold``, straight back during ``fall`` (s).

    A rise or fall of 0 s is a jump.
    """
    require_finite(to=to, from_=from_)
    require_not_negative(rise=rise, hold=hold, fall=fall, at=at)
    if to == from_:
        return constant(to)
    if rise + hold + fall == 0.0:
        raise DriveError("rise, hold and fall are all zero: nothing happens", "hold")
    change = to - from_
    spans = np.array([rise, hold, fall])
    poly = [
        [from_, change / rise if rise else 0.0],
        [to, 0.0],
        [to, -change / fall if fall else 0.0],
    ]
    kept = np.flatnonzero(spans)
    starts = np.concatenate([[0.0], np.cumsum(spans[kept])])
    rows = [*(poly[i] for i in kept), [from_, 0.0]]
    return once(at, from_, starts, rows, held(from_, at + starts[-1]), key="rise")


KIND = Kind(
    "trapezoid",
    "a straight rise, a hold and a straight fall back",
    (
        Field("to", "value", "value during the hold", required=True),
        Field("rise", "time", "how long the rise takes", required=True),
        Field("hold", "time", "how long the value is held", required=True),
        Field("fall", "time", "how long the fall takes", required=True),
        Field("from", "value", "value before and after", default=0.0),
        Field("at", "time", "time at which the rise begins", default=0.0),
    ),
    build,
)
