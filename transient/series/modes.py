"""Eigenvalues, eigenfunctions and weights of a gap at rest, for every shape and pair of wall conditions.

Eigenfunctions are ``r^-nu C_nu(lambda r)`` with C a Bessel function of order nu = (m - 1)/2.  Written as
amplitude and phase, ``phi = r^(-nu-1/2) Im[h_nu(lambda r) exp(i psi)]`` with h the reduced Hankel function, the
characteristic equation of every case is "phase gained across the gap = n pi": increasing, so no root is missed.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.special import j0, j1

from transient.series.basis import hankel_slopes, reduced_hankel
from transient.series.gapshape import FREE, GapShape
from transient.series.weak import WEAK, bessel_mean, bessel_mode, weak_root

_STEPS = 60
# Below this lambda times the inner radius a thin inner cylinder is told by the Bessel functions themselves.
THIN = 1.0
# From this inner radius over gap on the norms are taken without the differences of the two ends.
NARROW = 100.0
_SLOW = 30.0
_GAUSS = np.polynomial.legendre.leggauss(56)


@dataclass(frozen=True, eq=False)
class Modes:
    """The first M modes: ``rate`` (M,) = lambda^2, ``root`` (M,) = lambda.

    ``share`` (M, 3): projection of the unit steady flows (lower speed, upper speed, pressure drop) on each mode.
    ``stress`` (M, 2): traction of each mode on the walls; ``mean`` (M,).  ``doubt``: relative error of the roots, where
    weakly held fluid leaves more than round-off.
    """

    shape: GapShape
    root: np.ndarray
    rate: np.ndarray
    share: np.ndarray
    stress: np.ndarray
    mean: np.ndarray
    phase: np.ndarray
    doubt: float

    def velocity(self, y: np.ndarray) -> np.ndarray:
        """Eigenfunctions (M, k) at ``y`` (k,) in gaps from the lower wall."""
        shape, y = self.shape, np.asarray(y, dtype=float)
        if shape.axis:
            return j0(self.root[:, None] * y)
        r = shape.a + y
        turn = np.exp(1j * (self.root[:, None] * y - self.phase[:, None]))
        if shape.metric == 0:
            return turn.imag
        # Near a thin inner cylinder h is large and its phase all that is left: there the functions themselves.
        thin = self.root * shape.a < THIN
        out = np.empty((len(self.root), len(y)))
        out[thin] = bessel_mode(shape, self.root[thin, None], y)
        z = self.root[~thin, None] * r
        out[~thin] = r ** (-shape.order - 0.5) * (reduced_hankel(shape.order, z) * turn[~thin]).imag
        return out


@lru_cache(maxsize=256)
def modes(shape: GapShape, count: int) -> Modes:
    """The ``count`` slowest modes of a gap with at least one wall that holds the fluid back."""
    root = roots(shape, count)
    doubt = _doubt(root, shape)
    phase = _lower_phase(shape, root) if not shape.axis else np.zeros(count)
    values, slopes = _ends(shape, root)
    rate = root**2
    weight = np.array([shape.a, shape.b]) ** shape.metric if shape.metric else np.ones(2)
    flux = slopes * weight
    norm = _norms(shape, root, phase, values, slopes)
    push = flux[:, 0] - flux[:, 1]
    share = np.stack([flux[:, 0], -flux[:, 1], push / rate], axis=1) / (rate * norm)[:, None]
    if shape.lower == FREE or shape.axis:
        share[:, 0] = 0.0
    if shape.upper == FREE:
        share[:, 1] = 0.0
    if shape.metric == 3:
        share[:, 2] = 0.0
        # r C_1 integrates to -C_0 / lambda, and C_0 = 2 C_1 / z - C_2
        spins = 2 * values + slopes * np.array([shape.a, shape.b])
        mean = (spins[:, 0] - spins[:, 1]) / rate
        if _weak(shape, root):
            mean[0] = bessel_mean(shape, root[0])
    else:
        mean = push / rate / shape.volume
    stress = slopes * np.array([shape.levers[0], -shape.levers[1]])
    return Modes(shape, root, rate, share, stress, mean, phase, doubt)


def roots(shape: GapShape, count: int) -> np.ndarray:
    """The ``count`` smallest positive roots (count,), to a few units of round-off."""
    target = np.pi * (np.arange(1, count + 1) + _first(shape))
    low, high = np.full(count, 1e-9), target + 2 * np.pi
    low = np.maximum(low, target - 2.5 * np.pi)
    x = np.maximum(target, 0.5)
    for _ in range(_STEPS):
        gap = _gain(shape, x) - target
        low, high = np.where(gap < 0, x, low), np.where(gap >= 0, x, high)
        step = 1e-6 * x
        slope = (_gain(shape, x + step) - _gain(shape, x - step)) / (2 * step)
        new = x - gap / np.where(slope > 0, slope, 1.0)
        new = np.where((slope > 0) & (new > low) & (new < high), new, (low + high) / 2)
        done = np.abs(new - x) <= 4e-16 * new
        x = new
        if done.all():
            break
    if _weak(shape, x):
        x[0] = weak_root(shape, 0.98 * x[1])[0]
    return x


def _doubt(root: np.ndarray, shape: GapShape) -> float:
    """Largest relative error of the roots: round-off of the phases over how fast they turn."""
    kept = root[_weak(shape, root) :]
    step = 1e-5 * kept
    slope = (_gain(shape, kept + step) - _gain(shape, kept - step)) / (2 * step)
    doubt = float((2.3e-16 * np.pi * np.arange(1, len(kept) + 1) / (kept * slope)).max())
    return max(doubt, weak_root(shape, 0.98 * root[1])[1]) if len(kept) < len(root) else doubt


def _weak(shape: GapShape, root: np.ndarray) -> int:
    """How many modes (none or one) are slow enough to be written in Bessel functions themselves."""
    return int(shape.metric != 0 and root[0] < WEAK)


def _first(shape: GapShape) -> float:
    """Offset of the phase targets: where the count of modes starts."""
    return -0.25 if shape.axis else 0.0


def _gain(shape: GapShape, root: np.ndarray) -> np.ndarray:
    """Phase gained across the gap by a solution that meets the lower wall's condition, plus the upper wall's."""
    gain = root + _upper_phase(shape, root)
    return gain if shape.axis else gain - _lower_phase(shape, root)


def _lower_phase(shape: GapShape, root: np.ndarray) -> np.ndarray:
    return _end_phase(shape, root, shape.a, shape.lower, -1j)


def _upper_phase(shape: GapShape, root: np.ndarray) -> np.ndarray:
    return _end_phase(shape, root, shape.b, shape.upper, 1j)


def _end_phase(shape: GapShape, root: np.ndarray, r: float, slip: float, turn: complex) -> np.ndarray:
    """Argument of h_nu + turn slip lambda h_(nu+1): the wall's condition as a phase, continuous in lambda."""
    value, next_value = _hankels(shape, root * r)
    ratio = turn * next_value / value
    if slip == FREE:
        return np.angle(value) + np.angle(ratio)
    return np.angle(value) + np.angle(1.0 + slip * root * ratio)


def _hankels(shape: GapShape, z: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    if shape.metric == 0:
        one = np.ones(z.shape, complex)
        return one, one
    return reduced_hankel(shape.order, z), reduced_hankel(shape.order + 1, z)


def _ends(shape: GapShape, root: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Values and slopes of the eigenfunctions at both ends, each (M, 2).

    The walls' conditions and Re[h_(nu+1) conj(h_nu)] = 1 (the Wronskian, A&S 9.1.16) leave one modulus.
    """
    if shape.axis:
        zero = np.zeros_like(root)
        return np.stack([zero + 1, j0(root)], 1), np.stack([zero, -root * j1(root)], 1)
    sign = np.where(np.arange(1, len(root) + 1) % 2, -1.0, 1.0)
    values, slopes = np.zeros((len(root), 2)), np.zeros((len(root), 2))
    for end, (r, side, slip) in enumerate(((shape.a, 1.0, shape.lower), (shape.b, -1.0, shape.upper))):
        value, next_value = _hankels(shape, root * r)
        size = (r ** (-shape.order - 0.5) if shape.metric else 1.0) * (1.0 if end == 0 else sign)
        if slip == FREE:
            values[:, end] = side * size / np.abs(next_value)
        else:
            slopes[:, end] = size * root / np.abs(value - side * 1j * slip * root * next_value)
            values[:, end] = side * slip * slopes[:, end]
    return values, slopes


def _norms(shape: GapShape, root: np.ndarray, phase: np.ndarray, values: np.ndarray, slopes: np.ndarray) -> np.ndarray:
    """Integral of r^m phi^2 (M,)."""
    if shape.a < NARROW:
        return _norms_by_ends(shape, root, values, slopes)
    out = np.empty_like(root)
    slow = root < _SLOW
    y, weight = 0.5 * (_GAUSS[0] + 1.0), 0.5 * _GAUSS[1]
    z = root[slow, None] * (shape.a + y)
    turn = np.exp(1j * (root[slow, None] * y - phase[slow, None]))
    out[slow] = (reduced_hankel(shape.order, z) * turn).imag ** 2 @ weight
    out[~slow] = _norms_by_parts(shape, root[~slow], phase[~slow])
    return out


def _norms_by_ends(shape: GapShape, root: np.ndarray, values: np.ndarray, slopes: np.ndarray) -> np.ndarray:
    """From d[r^(m+1) (phi'^2 + lambda^2 phi^2)] and one integration by parts (own derivation)."""
    ends = np.array([shape.a, shape.b])
    m = shape.metric
    energy = ends ** (m + 1) * (slopes**2 + root[:, None] ** 2 * values**2)
    cross = (1 - m) * ends**m * values * slopes if m else values * slopes
    total = energy - cross
    return (total[:, 1] - total[:, 0]) / (2 * root**2)


def _norms_by_parts(shape: GapShape, root: np.ndarray, phase: np.ndarray) -> np.ndarray:
    """In a nearly closed annulus the ends nearly cancel: mean of |h|^2, less the wave of h^2 by parts."""
    y, weight = np.polynomial.legendre.leggauss(6)
    y, weight = 0.5 * (y + 1.0), 0.5 * weight
    mean = np.abs(reduced_hankel(shape.order, root[:, None] * (shape.a + y))) ** 2 @ weight
    wave = 0.0
    for sign, r, distance in ((1.0, shape.b, 1.0), (-1.0, shape.a, 0.0)):
        h, first, second = hankel_slopes(shape.order, root * r)
        rate = 2j * root
        terms = h * h / rate - 2 * h * first * root / rate**2 + 2 * (first**2 + h * second) * root**2 / rate**3
        wave = wave + sign * (terms * np.exp(2j * (root * distance - phase))).real
    return 0.5 * (mean - wave)
