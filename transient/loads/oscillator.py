"""A damped oscillator under a load of straight lines: exact state and largest deflection, compiled.

u'' + 2 z u' + u = p in the phase y = (natural angular frequency) x time, u in static deflections.  Under
p = p0 + g y (from memory, any text on vibration):
u = p0 + g y - 2 z g + exp(-z y) (A cos(d y) + B sin(d y)), d = sqrt(1 - z^2).
"""

from __future__ import annotations

import math

import numpy as np

from transient.compiled import compiled, part

# Below this phase a step is taken by its power series: the closed form divides by the phase.
SHORT = 0.1
TERMS = 9  # 0.1^11 / 11! is far below round-off
_SHARE = tuple(1.0 / ((n + 1.0) * (n + 2.0)) for n in range(TERMS))
# Below this phase what a deflection does inside a step is less than round-off of the step's ends.
TINY = 1e-5
ENDS = 4  # half swings looked at from either end of a long step
CLOSE = 1e-8  # phase error of an extreme; its value is off by the square of it


@part
def _series(u: float, w: float, p: float, rise: float, x: float, z: float):
    """(u, w = du/dy) after the phase ``x`` in which the load rises by ``rise``; by power series."""
    c, d = u, w * x  # coefficients of (y/x)^n and ^(n+1)
    deflection, turn = c + d, 0.0
    load = p
    for n in range(TERMS):
        e = (x * x * (load - c) - 2.0 * z * x * (n + 1.0) * d) * _SHARE[n]
        load = rise if n == 0 else 0.0
        c, d = d, e
        deflection += e
        turn += (n + 2.0) * e
    return deflection, w + turn / x


@part
def _at(y: float, p: float, g: float, z: float, d: float, a: float, b: float):
    """Deflection at phase ``y`` of a step in closed form."""
    return p + g * (y - 2.0 * z) + math.exp(-z * y) * (a * math.cos(d * y) + b * math.sin(d * y))


@part
def _speed(y: float, g: float, z: float, d: float, r: float, phase: float):
    """du/dy at phase ``y``."""
    return g + r * math.exp(-z * y) * math.cos(d * y - phase)


@part
def _extreme(low: float, high: float, g: float, z: float, d: float, r: float, phase: float, lag: float):
    """Phase in [low, high] at which du/dy, monotone there, is zero: Newton, kept inside by bisection."""
    falls = _speed(low, g, z, d, r, phase) > 0.0
    y = 0.5 * (low + high)
    for _ in range(60):
        w = _speed(y, g, z, d, r, phase)
        if (w > 0.0) == falls:
            low = y
        else:
            high = y
        slope = -r * math.exp(-z * y) * math.sin(d * y - phase + lag)
        step = -w / slope if slope != 0.0 else 2.0 * (high - low)
        new = y + step
        if not low <= new <= high:
            new = 0.5 * (low + high)
        if abs(new - y) < CLOSE:
            return new
        y = new
    return y


@part
def _inside(u: float, w: float, p: float, g: float, x: float, z: float, d: float, top: float):
    """The larger of ``top`` and the largest |deflection| inside a step of phase ``x``.

    du/dy is monotone over each half swing (shifted by the damping), so each holds one extreme at most, where du/dy
    changes sign.  Extremes of one kind lie on a curve that is convex while the swing is larger than the load's own
    motion, and grow with the load after that: the first and the last few hold the largest.
    """
    a = u - p + 2.0 * z * g
    b = (w - g + z * a) / d
    r = math.hypot(w - g, z * b + d * a)
    if r <= abs(g):
        return top
    phase = math.atan2(-z * b - d * a, w - g)
    lag = math.atan2(z, d)
    shift = lag - phase
    first = math.floor(shift / math.pi)
    last = math.floor((shift + d * x) / math.pi)
    half = first
    while half <= last:
        low = max(0.0, (half * math.pi - shift) / d)
        high = min(x, ((half + 1) * math.pi - shift) / d)
        if _speed(low, g, z, d, r, phase) * _speed(high, g, z, d, r, phase) < 0.0:
            y = _extreme(low, high, g, z, d, r, phase, lag)
            top = max(top, abs(_at(y, p, g, z, d, a, b)))
        half += 1
        if half == first + ENDS and last - ENDS >= half:
            half = last - ENDS + 1
    return top


@part
def _long(u: float, w: float, p: float, rise: float, x: float, z: float, d: float, top: float):
    """(u, w, top) after a step of phase ``x``, by the closed form."""
    g = rise / x
    a = u - p + 2.0 * z * g
    b = (w - g + z * a) / d
    fade = math.exp(-z * x)
    c, s = fade * math.cos(d * x), fade * math.sin(d * x)
    reach = max(abs(p - 2.0 * z * g), abs(p + rise - 2.0 * z * g)) + math.sqrt(a * a + b * b)
    if reach > top:
        top = _inside(u, w, p, g, x, z, d, top)
    deflection = p + rise - 2.0 * z * g + a * c + b * s
    speed = g + (w - g) * c - (z * b + d * a) * s
    return deflection, speed, max(top, abs(deflection))


@part
def _largest(time: np.ndarray, value: np.ndarray, before: float, omega: float, z: float):
    """Largest |deflection| of one oscillator over the history and the free vibration after it."""
    d = math.sqrt(1.0 - z * z)
    u, w, top = before, 0.0, abs(before)
    for i in range(len(time) - 1):
        x = omega * (time[i + 1] - time[i])
        if x <= 0.0:
            continue
        p, rise = value[i], value[i + 1] - value[i]
        if x > SHORT:
            u, w, top = _long(u, w, p, rise, x, z, d, top)
            continue
        u1, w1 = _series(u, w, p, rise, x, z)
        ends = max(abs(u), abs(u1))
        bend = 0.25 * x * x * (abs(p) + abs(rise) + ends + 2.0 * (abs(w) + abs(w1)))
        if ends + bend > top and x > TINY:
            top = _inside(u, w, p, rise / x, x, z, d, top)
        u, w = u1, w1
        top = max(top, abs(u))
    p = value[len(value) - 1]
    # One swing about the last load holds the largest of all that follow, and the load itself is what they tend to.
    u, w, top = _long(u, w, p, 0.0, 2.0 * math.pi / d, z, d, max(top, abs(p)))
    return top


@compiled
def largest_deflections(
    time: np.ndarray, value: np.ndarray, before: float, omega: np.ndarray, damping: float, out: np.ndarray
) -> None:
    """Fills ``out`` (k,) with the largest |deflection| of oscillators at ``omega`` (k,) rad/s, in static deflections.

    ``time`` (n,) s not falling, ``value`` (n,) the load with straight lines between; ``before`` the load before the
    first row, with which the oscillator is in equilibrium; after the last row the load is held.  ``damping`` ratio in
    [0, 1).  No step is too long or too short: states are exact, and extremes inside the steps count.
    """
    for j in range(len(omega)):
        out[j] = _largest(time, value, before, omega[j], damping)
