"""A half-cosine change: no jump of slope at either end."""

from __future__ import annotations

import math

from transient.drive import ramp
from transient.drive.assemble import held, once, require_finite, require_not_negative, require_positive
from transient.drive.kind import Kind
from transient.drive.pieces import Drive, constant


def build(to: float, over: float, from_: float = 0.0, at: float = 0.0) -> Drive:
    """``from_ + (to - from_) (1 - cos(pi (t - at) / over)) / 2`` between ``at`` and ``at + over`` (s), held outside."""
    require_finite(to=to, from_=from_)
    require_positive(over=over)
    require_not_negative(at=at)
    if to == from_:
        return constant(to)
    half = (to - from_) / 2.0
    wave = {0: (complex(-half), 1j * math.pi / over)}
    return once(at, from_, [0.0, over], [[from_ + half], [to]], held(to, at + over), wave, key="over")


KIND = Kind("smooth_ramp", "a half-cosine from one value to another", ramp.FIELDS, build)
