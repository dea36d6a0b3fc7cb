"""A first-order approach."""

from __future__ import annotations

import math

from transient.drive.assemble import held, once, require_finite, require_not_negative, require_positive
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, constant


def build(to: float, time_constant: float, from_: float = 0.0, at: float = 0.0) -> Drive:
    """``to + (from_ - to) exp(-(t - at) / time_constant)`` from ``at`` (s) on, ``from_`` before."""
    require_finite(to=to, from_=from_)
    require_positive(time_constant=time_constant)
    require_not_negative(at=at)
    if to == from_:
        return constant(to)
    wave = {0: (complex(from_ - to), complex(-1.0 / time_constant))}
    return once(at, from_, [0.0], [[to]], held(to, math.inf), wave)


KIND = Kind(
    "lag",
    "a first-order approach to a value",
    (
        Field("to", "value", "value approached", required=True),
        Field("time_constant", "time", "time in which the distance falls to 1/e", required=True, positive=True),
        Field("from", "value", "value before", default=0.0),
        Field("at", "time", "time at which the approach begins", default=0.0),
    ),
    build,
)
