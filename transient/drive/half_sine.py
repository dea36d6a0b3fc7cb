"""One half wave: the usual idealised shock pulse."""

from __future__ import annotations

import math

from transient.drive.assemble import held, once, require_finite, require_not_negative, require_positive
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, constant


def build(amplitude: float, over: float, at: float = 0.0) -> Drive:
    """``amplitude sin(pi (t - at) / over)`` between ``at`` and ``at + over`` (s), zero outside."""
    require_finite(amplitude=amplitude)
    require_positive(over=over)
    require_not_negative(at=at)
    if amplitude == 0.0:
        return constant(0.0)
    wave = {0: (-1j * amplitude, 1j * math.pi / over)}
    return once(at, 0.0, [0.0, over], [[0.0], [0.0]], held(0.0, at + over), wave, key="over")


KIND = Kind(
    "half_sine",
    "one half wave, then zero",
    (
        Field("amplitude", "value", "value at the top", required=True),
        Field("over", "time", "how long the half wave takes", required=True, positive=True),
        Field("at", "time", "time at which it begins", default=0.0),
    ),
    build,
)
