"""A harmonic oscillation."""

from __future__ import annotations

import cmath
import math

import numpy as np

from transient.drive.assemble import once, require_finite, require_not_negative, require_positive
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, DriveError, Eventual, Pieces, Track, constant, periodic


def build(
    amplitude: float,
    frequency: float | None = None,
    period: float | None = None,
    phase: float = 0.0,
    mean: float = 0.0,
    at: float = 0.0,
) -> Drive:
    """``mean + amplitude sin(2 pi frequency (t - at) + phase)`` from ``at`` (s) on, ``mean`` before.

    ``frequency`` in cycles per second or ``period`` in s, exactly one; ``phase`` in rad.
    """
    if (frequency is None) == (period is None):
        key = "frequency" if frequency is None else "period"
        raise DriveError("a sine needs exactly one of frequency and period", key)
    require_finite(amplitude=amplitude, mean=mean, phase=phase)
    require_not_negative(at=at)
    if period is None:
        require_positive(frequency=frequency)
        period = 1.0 / frequency
    require_positive(period=period)
    if amplitude == 0.0:
        return constant(mean)
    speed = 2.0j * math.pi / period
    if at == 0.0:
        return _everlasting(mean, amplitude, speed, phase, period, before=mean)
    # Whole turns are taken out first, so that a late start does not cost digits of the phase.
    turned = phase - 2.0 * math.pi * math.fmod(at, period) / period
    now = mean + amplitude * math.sin(turned)
    regime = _everlasting(mean, amplitude, speed, turned, period, before=now)
    wave = {0: (_phasor(amplitude, phase), speed)}
    return once(at, mean, [0.0], [[mean]], Eventual(regime, period, at), wave)


def _phasor(amplitude: float, phase: float) -> complex:
    """c such that Re(c exp(i w t)) = amplitude sin(w t + phase)."""
    return -1j * amplitude * cmath.exp(1j * phase)


def _everlasting(mean: float, amplitude: float, speed: complex, phase: float, period: float, before: float) -> Drive:
    poly = np.array([[mean, 0.0, 0.0, 0.0]])
    coeff, rate = np.array([[_phasor(amplitude, phase)]]), np.array([[speed]])
    return periodic((Track(Pieces(np.zeros(1), poly, coeff, rate, before)),), period, before)


KIND = Kind(
    "sine",
    "a sine about a mean",
    (
        Field("amplitude", "value", "half the distance from trough to crest", required=True),
        Field("frequency", "frequency", "cycles per second; or give period", positive=True),
        Field("period", "time", "time of one cycle; or give frequency", positive=True),
        Field("phase", "angle", "angle at the time `at`", default=0.0),
        Field("mean", "value", "value about which it swings, and before `at`", default=0.0),
        Field("at", "time", "time at which it begins", default=0.0),
    ),
    build,
)
