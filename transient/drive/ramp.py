"""A straight-line change."""

from __future__ import annotations

from transient.drive.assemble import held, once, require_finite, require_not_negative, require_positive
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, constant

FIELDS = (
    Field("to", "value", "value at the end of the change", required=True),
    Field("over", "time", "how long the change takes", required=True, positive=True),
    Field("from", "value", "value before the change", default=0.0),
    Field("at", "time", "time at which the change begins", default=0.0),
)


def build(to: float, over: float, from_: float = 0.0, at: float = 0.0) -> Drive:
    """``from_ + (to - from_) (t - at) / over`` between ``at`` and ``at + over`` (s), held outside."""
    require_finite(to=to, from_=from_)
    require_positive(over=over)
    require_not_negative(at=at)
    if to == from_:
        return constant(to)
    return once(at, from_, [0.0, over], [[from_, (to - from_) / over], [to]], held(to, at + over), key="over")


KIND = Kind("ramp", "a straight line from one value to another", FIELDS, build)
