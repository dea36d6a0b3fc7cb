"""A sudden change."""

from __future__ import annotations

from transient.drive.assemble import held, once, require_finite, require_not_negative
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, constant


def build(to: float, from_: float = 0.0, at: float = 0.0) -> Drive:
    """``from_`` up to ``at`` (s), ``to`` from then on."""
    require_finite(to=to, from_=from_)
    require_not_negative(at=at)
    if at == 0.0 or to == from_:
        return constant(to, before=from_)
    return once(at, from_, [0.0], [[to]], held(to, at))


KIND = Kind(
    "step",
    "a sudden change from one value to another",
    (
        Field("to", "value", "value after the step", required=True),
        Field("from", "value", "value before the step", default=0.0),
        Field("at", "time", "time of the step", default=0.0),
    ),
    build,
)
