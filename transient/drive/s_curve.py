"""The jerk-limited change of speed of a motion controller."""

from __future__ import annotations

import math

from transient.drive.assemble import held, once, require_finite, require_not_negative, require_positive
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, constant


def build(to: float, acceleration: float, jerk: float, from_: float = 0.0, at: float = 0.0) -> Drive:
    """The fastest change from ``from_`` to ``to`` within two magnitudes: of the slope and of the slope's rate.

    The slope rises at ``jerk``, stays at ``acceleration`` where it gets there, and falls at ``jerk``
    (kinematics of constant jerk; common practice of motion control, no source).
    """
    require_finite(to=to, from_=from_)
    require_positive(acceleration=acceleration, jerk=jerk)
    require_not_negative(at=at)
    change = abs(to - from_)
    if change == 0.0:
        return constant(to)
    sign = math.copysign(1.0, to - from_)
    build_up = min(acceleration / jerk, math.sqrt(change / jerk))
    slope = sign * jerk * build_up
    gain = slope * build_up / 2.0
    straight = max(change / abs(slope) - build_up, 0.0)
    curve = sign * jerk / 2.0
    starts, poly = [0.0], [[from_, 0.0, curve]]
    # The straight part vanishes to round-off where the change just reaches the limit.
    if straight > 1e-12 * build_up:
        starts.append(build_up)
        poly.append([from_ + gain, slope])
    else:
        straight = 0.0
    starts += [build_up + straight, 2.0 * build_up + straight]
    poly += [[to - gain, slope, -curve], [to]]
    return once(at, from_, starts, poly, held(to, at + starts[-1]), key="jerk")


KIND = Kind(
    "s_curve",
    "a change of speed within limits of acceleration and jerk, as motion controllers make it",
    (
        Field("to", "value", "value at the end of the change", required=True),
        Field("acceleration", "value_rate", "largest rate of change, a magnitude", required=True, positive=True),
        Field("jerk", "value_jerk", "how fast the acceleration changes, a magnitude", required=True, positive=True),
        Field("from", "value", "value before the change", default=0.0),
        Field("at", "time", "time at which the change begins", default=0.0),
    ),
    build,
)
