"""Time histories restated from their definitions, and what a decaying mode answers to them, in closed form.

Deliberately apart from the product's own histories: a wrong one must not be compared with itself.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

END = np.inf
AFTER = 1.0 + 1e-12  # a jump's own instant, round-off included, counts as before it


@dataclass(frozen=True)
class Stretch:
    """Between ``begin`` and ``end`` (s) the input changes at the rate sum(poly_j x^j) + Re(wave exp(speed x)) with x
    the time since ``begin``; per s."""

    begin: float
    end: float
    poly: tuple[float, ...] = ()
    wave: complex = 0j
    speed: complex = 1j

    def rate(self, t: np.ndarray) -> np.ndarray:
        """Rate of change (n,) at times ``t`` (n,), from the left."""
        x = t - self.begin
        value = (self.wave * np.exp(self.speed * np.clip(x, 0.0, self.end - self.begin))).real
        for power, factor in enumerate(self.poly):
            value = value + factor * x**power
        return np.where((x > 0.0) & (t <= self.end), value, 0.0)

    def gain(self, t: np.ndarray) -> np.ndarray:
        """What has been added to the input by times ``t`` (n,)."""
        x = np.clip(t - self.begin, 0.0, self.end - self.begin)
        value = (self.wave / self.speed * np.expm1(self.speed * x)).real
        for power, factor in enumerate(self.poly):
            value = value + factor * x ** (power + 1) / (power + 1)
        return value

    def faded(self, t: np.ndarray, decay: np.ndarray) -> np.ndarray:
        """Integral of exp(-decay (t - s)) rate(s) ds up to ``t``: (n, N) for times (n,) and rates (N,)."""
        x = np.clip(t - self.begin, 0.0, self.end - self.begin)[:, None]
        k = decay[None, :]
        answer = (self.wave * (np.exp(self.speed * x) - np.exp(-k * x)) / (self.speed + k)).real
        term = -np.expm1(-k * x) / k
        for power, factor in enumerate(self.poly):
            if power:
                term = (x**power - power * term) / k
            answer = answer + factor * term
        return answer * np.exp(-k * np.maximum(t - self.end, 0.0)[:, None])


@dataclass(frozen=True)
class Motion:
    """An input over time: ``before`` t = 0, ``jumps`` (time, size), ``stretches``."""

    before: float = 0.0
    jumps: tuple[tuple[float, float], ...] = ()
    stretches: tuple[Stretch, ...] = ()

    def from_rest(self) -> Motion:
        """The same where nothing moved before t = 0: the value before is a jump at t = 0."""
        return replace(self, before=0.0, jumps=((0.0, self.before), *self.jumps))

    def value(self, t: np.ndarray) -> np.ndarray:
        """(n,) at times ``t``, from the left at a jump after t = 0."""
        out = np.full(len(t), self.before)
        for at, height in self.jumps:
            out = out + np.where(t > at * AFTER, height, 0.0)
        return out + sum((part.gain(t) for part in self.stretches), np.zeros(len(t)))

    def rate(self, t: np.ndarray) -> np.ndarray:
        """Rate of change (n,), jumps aside."""
        return sum((part.rate(t) for part in self.stretches), np.zeros(len(t)))

    def faded(self, t: np.ndarray, decay: np.ndarray) -> np.ndarray:
        """What is left of all changes in a mode that decays at ``decay`` (N,): (n, N), the sum over the changes."""
        out = np.zeros((len(t), len(decay)))
        for at, height in self.jumps:
            age = np.maximum(t - at, 0.0)[:, None]
            out += np.where(t[:, None] > at * AFTER, height * np.exp(-decay * age), 0.0)
        for part in self.stretches:
            out += part.faded(t, decay)
        return out

    def breaks(self) -> np.ndarray:
        """Times (b,) after which modes of any speed are under way."""
        ends = [t for part in self.stretches for t in (part.begin, part.end) if np.isfinite(t)]
        return np.unique([*(at for at, height in self.jumps if height), *ends])


def held(to: float) -> Motion:
    """A sudden start at t = 0."""
    return Motion(0.0, ((0.0, to),))


def step(to: float, from_: float, at: float) -> Motion:
    return Motion(from_, ((at, to - from_),))


def ramp(to: float, over: float, from_: float = 0.0, at: float = 0.0) -> Motion:
    return Motion(from_, (), (Stretch(at, at + over, ((to - from_) / over,)),))


def smooth_ramp(to: float, over: float, from_: float, at: float) -> Motion:
    # rate (to - from)/2 pi/over sin(pi x/over)
    turn = np.pi / over
    return Motion(from_, (), (Stretch(at, at + over, (), -0.5j * (to - from_) * turn, 1j * turn),))


def s_curve(to: float, acceleration: float, jerk: float) -> Motion:
    """From 0, reaching its largest acceleration: jerk, constant acceleration, jerk."""
    build = acceleration / jerk
    flat = to / acceleration - build
    times = np.cumsum([0.0, build, flat, build])
    polys = ((0.0, jerk), (acceleration,), (acceleration, -jerk))
    return Motion(0.0, (), tuple(Stretch(a, b, p) for (a, b), p in zip(pairwise(times), polys, strict=True)))


def trapezoid(to: float, rise: float, hold: float, fall: float, from_: float) -> Motion:
    up, down = (to - from_) / rise, (from_ - to) / fall
    end = rise + hold
    return Motion(from_, (), (Stretch(0.0, rise, (up,)), Stretch(end, end + fall, (down,))))


def lag(to: float, time_constant: float, from_: float) -> Motion:
    speed = -1.0 / time_constant
    return Motion(from_, (), (Stretch(0.0, END, (), (from_ - to) * speed + 0j, speed + 0j),))


def sine(amplitude: float, frequency: float, mean: float, phase: float) -> Motion:
    turn = 2j * np.pi * frequency
    start = amplitude * np.sin(phase)
    return Motion(mean, ((0.0, start),), (Stretch(0.0, END, (), -1j * turn * amplitude * np.exp(1j * phase), turn),))


def half_sine(amplitude: float, over: float, at: float) -> Motion:
    turn = 1j * np.pi / over
    return Motion(0.0, (), (Stretch(at, at + over, (), -1j * turn * amplitude, turn),))


def lines(times: list[float], values: list[float]) -> Motion:
    """A table joined by straight lines; two rows at one time are a jump."""
    jumps, parts = [], []
    for (a, b), (low, high) in zip(pairwise(times), pairwise(values), strict=True):
        if a == b:
            jumps.append((a, high - low))
        else:
            parts.append(Stretch(a, b, ((high - low) / (b - a),)))
    return Motion(values[0], tuple(jumps), tuple(parts))


def monotone(times: list[float], values: list[float]) -> Motion:
    """A table joined by the monotone cubic of Fritsch & Butland (1984): harmonic means inside, parabola ends."""
    h, chord = np.diff(times), np.diff(values) / np.diff(times)
    slope = np.empty(len(times))
    for i in range(1, len(times) - 1):
        left, right = 2 * h[i] + h[i - 1], h[i] + 2 * h[i - 1]
        same = chord[i - 1] * chord[i] > 0.0
        slope[i] = (left + right) / (left / chord[i - 1] + right / chord[i]) if same else 0.0
    slope[0] = _end(h[0], h[1], chord[0], chord[1])
    slope[-1] = _end(h[-1], h[-2], chord[-1], chord[-2])
    parts = []
    for i, (a, b) in enumerate(pairwise(times)):
        bend = (3 * chord[i] - 2 * slope[i] - slope[i + 1]) / h[i]
        twist = (slope[i] + slope[i + 1] - 2 * chord[i]) / h[i] ** 2
        parts.append(Stretch(a, b, (slope[i], 2 * bend, 3 * twist)))
    return Motion(values[0], (), tuple(parts))


def _end(near: float, far: float, chord: float, next_chord: float) -> float:
    """Slope at an end of the table: of the parabola through three rows, kept within the monotone range."""
    slope = ((2 * near + far) * chord - near * next_chord) / (near + far)
    if slope * chord <= 0.0:
        return 0.0
    return 3 * chord if chord * next_chord <= 0.0 and abs(slope) > 3 * abs(chord) else slope


def total(one: Motion, other: Motion) -> Motion:
    return Motion(one.before + other.before, one.jumps + other.jumps, one.stretches + other.stretches)


def again(one: Motion, every: float, until: float) -> Motion:
    """A motion that begins and ends at 0, over and over."""
    shifts = np.arange(int(np.ceil(until / every))) * every
    return Motion(
        0.0, (), tuple(replace(p, begin=p.begin + s, end=p.end + s) for s in shifts for p in one.stretches)
    )
