"""The oscillating modes of sprung bodies: poles off the negative axis, their shares, and their amplitudes in time.

Fluid alone decays without swinging, and each spring adds at most one pair of complex poles (the coupled operator is
symmetric but for one negative square per spring; Pontryagin 1944).  Pairs near the negative axis stay
inside the contours; the others are counted on the boundary of the sector that is left (argument principle),
found by Newton's method, and taken out of the transfer functions.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import factorial

import numpy as np

from transient.series.closing import Closing
from transient.series.gapshape import FREE, SeriesError
from transient.series.slow import wall_response
from transient.series.timeline import Timeline

# Pairs this near the negative axis (rad) are held by the contours, which pass it at 0.69.
BESIDE = 0.15
_REACH = 1e3  # decades beyond the estimated size of the poles, either way
_PER_DECADE = 20
_SMOOTH = 0.8  # rad between neighbours on the boundary
_CIRCLE = 32  # points of a residue's circle, at 0.3 of the way to anything else: leaves 2e-17
_NEWTON = 60
_APART = 1e-3  # poles closer than this share of their size are not told apart here
_SERIES = 22


@dataclass(frozen=True, eq=False)
class Swings:
    """``pole`` (P,) with positive imaginary part; ``residue`` (P, 3, 3) inputs by unknowns; ``walls`` (P, 3, 3) the
    gap's transfer functions at the poles."""

    pole: np.ndarray
    residue: np.ndarray
    walls: np.ndarray


def swings(closing: Closing) -> Swings:
    """The oscillating modes outside the contours.  Raises ``SeriesError`` where two of them cannot be told apart."""
    sprung = [end for end in (0, 1) if closing.stiffness[end] > 0.0]
    if not sprung:
        return Swings(np.empty(0, complex), np.empty((0, 3, 3), complex), np.empty((0, 3, 3), complex))
    low, high = _range(closing, sprung)
    count = _count(closing, low, high)
    pole = _find(closing, low, high, count) if count else np.empty(0, complex)
    residue = np.array([_residue(closing, pole, k) for k in range(len(pole))]).reshape(-1, 3, 3)
    return Swings(pole, residue, wall_response(closing.shape, pole) if count else np.empty((0, 3, 3), complex))


def determinant(closing: Closing, s: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(S,) determinant of the closing at ``s``, and the size of its terms."""
    matrix, size = closing.matrix(s, wall_response(closing.shape, s))
    return np.linalg.det(matrix), size.sum(axis=2).prod(axis=1)


def _range(closing: Closing, sprung: list[int]) -> tuple[float, float]:
    """Radii between which all oscillating poles lie: where a spring is as strong as what it works against."""
    at = np.logspace(-40, 40, 1601)
    low, high = np.inf, 0.0
    for end in sprung:
        slip = (closing.shape.lower, closing.shape.upper)[end]
        held = np.minimum(at**1.5, at / slip) if 0.0 < slip < FREE else at**1.5
        own = closing.mass[end] * at**2 + closing.damping[end] * at
        weak, strong = own + held, own + 10.0 * at + at**1.5
        low = min(low, float(at[np.searchsorted(strong, closing.stiffness[end])]))
        high = max(high, float(at[np.searchsorted(weak, closing.stiffness[end])]))
    return low / _REACH, high * _REACH


def _count(closing: Closing, low: float, high: float) -> int:
    """Zeros of the determinant in the upper half plane outside the wedge around the negative axis."""
    turn = np.pi - BESIDE
    points = int(np.ceil(_PER_DECADE * np.log10(high / low)))
    ray = np.geomspace(low, high, points) * np.exp(1j * turn)
    angle = np.linspace(0.0, turn, 16)
    path = np.concatenate([low * np.exp(1j * angle), ray[1:-1], high * np.exp(1j * angle[::-1])])
    value = determinant(closing, path)[0]
    for _ in range(12):
        step = np.angle(value[1:] / value[:-1])
        coarse = np.flatnonzero(np.abs(step) > _SMOOTH)
        if len(coarse) == 0:
            break
        middle = np.sqrt(path[coarse]) * np.sqrt(path[coarse + 1])
        path = np.insert(path, coarse + 1, middle)
        value = np.insert(value, coarse + 1, determinant(closing, middle)[0])
    turns = -float(np.angle(value[1:] / value[:-1]).sum()) / (2.0 * np.pi)
    if abs(turns - round(turns)) > 0.05 or not 0 <= round(turns) <= 2:
        raise SeriesError("the oscillating modes of the sprung bodies could not be counted")
    return round(turns)


def _find(closing: Closing, low: float, high: float, count: int) -> np.ndarray:
    """The ``count`` poles of the sector, by Newton's method from the best places of a grid."""
    radius = np.geomspace(low, high, int(8 * np.log10(high / low)))
    angle = np.linspace(0.35, np.pi - BESIDE, 10)
    grid = (radius[:, None] * np.exp(1j * angle)).ravel()
    value, size = determinant(closing, grid)
    order = np.argsort(np.abs(value) / size)
    found: list[complex] = []
    for start in grid[order[:60]]:
        pole = _newton(closing, complex(start), found)
        if pole is None or not 0.0 < np.angle(pole) <= np.pi - BESIDE:
            continue
        if any(abs(pole - other) < _APART * abs(pole) for other in found):
            continue
        found.append(pole)
        if len(found) == count:
            return np.array(found)
    raise SeriesError("the oscillating modes of the sprung bodies lie too close together to be told apart")


def _newton(closing: Closing, start: complex, found: list[complex]) -> complex | None:
    """A zero from ``start``, those ``found`` divided out; None where the way leads astray."""
    s = start
    around = np.exp(2j * np.pi * np.arange(4) / 4)
    for _ in range(_NEWTON):
        radius = 1e-3 * abs(s)
        value, _ = determinant(closing, np.append(s + radius * around, s))
        slope = (value[:4] / around).mean() / radius
        if value[4] == 0.0:
            return s
        change = slope / value[4] - sum(1.0 / (s - other) + 1.0 / (s - other.conjugate()) for other in found)
        if change == 0.0 or not np.isfinite(change):
            return None
        step = -1.0 / change
        if abs(step) > 0.3 * abs(s):
            step *= 0.3 * abs(s) / abs(step)
        s += complex(step)
        if s.imag <= 0.0:
            s = complex(s.real, 0.01 * abs(s))
        if abs(step) < 3e-15 * abs(s):
            return s
    return s if abs(step) < 1e-11 * abs(s) else None


def _residue(closing: Closing, pole: np.ndarray, k: int) -> np.ndarray:
    """(3, 3) share of pole k in the unknowns (columns) per input (rows), by the mean over a circle around it."""
    own = pole[k]
    others = np.abs(np.delete(pole, k) - own)
    radius = 0.3 * min([abs(own.imag), abs(own), *others.tolist()])
    turn = radius * np.exp(2j * np.pi * np.arange(_CIRCLE) / _CIRCLE)
    unknown = closing.unknowns(own + turn)[0]
    return (unknown * turn[:, None, None]).mean(axis=0)


def amplitudes(
    swing: Swings, line: Timeline, before: np.ndarray, kick: np.ndarray, piece: np.ndarray, offset: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Integrals (n, P, 3) of exp(pole (t - tau)) (input - before) since the first break, and the size of their terms.

    ``kick`` (3,): unit impulses of the inputs at the first break.
    """
    poles, rows = len(swing.pole), len(piece)
    out, size = np.zeros((rows, poles, 3), complex), np.zeros((rows, poles, 3))
    lengths = line.lengths
    used = slice(0, int(piece.max(initial=0)) + 1)
    pieces = np.arange(len(line.starts))[used]
    for m, pole in enumerate(swing.pole):
        for i in range(3):
            gained, large = _gained(pole, line, before, i, pieces[:-1], lengths[: len(pieces) - 1])
            state, reach = np.zeros(len(pieces), complex), np.zeros(len(pieces))
            state[0], reach[0] = kick[i], abs(kick[i])
            decay = np.exp(pole * lengths[: len(pieces) - 1])
            for p in range(len(pieces) - 1):
                state[p + 1] = decay[p] * state[p] + gained[p]
                reach[p + 1] = abs(decay[p]) * reach[p] + large[p]
            now, big = _gained(pole, line, before, i, piece, offset)
            fade = np.exp(pole * offset)
            out[:, m, i] = fade * state[piece] + now
            size[:, m, i] = np.abs(fade) * reach[piece] + big
    return out, size


def cycle_transform(line: Timeline, length: float, s: np.ndarray) -> np.ndarray:
    """(S, 3) integrals of exp(s (length - tau)) input(tau) over one cycle of ``length``, the line's pieces in turn."""
    pieces = np.arange(len(line.starts))
    ends = np.append(line.starts[1:], length)
    out = np.zeros((len(s), 3), complex)
    for n, pole in enumerate(s):
        for i in range(3):
            gained, _ = _gained(pole, line, np.zeros(3), i, pieces, ends - line.starts)
            out[n, i] = (np.exp(pole * (length - ends)) * gained).sum()
    return out


def _gained(pole: complex, line: Timeline, before: np.ndarray, i: int, piece: np.ndarray, x: np.ndarray):  # type: ignore[no-untyped-def]
    """(m,) integral of exp(pole (x - xi)) (input i - before) over the first ``x`` of each ``piece``, and its size."""
    z = pole * x
    weights = _weights(z)
    poly = line.poly[piece, i].copy()
    poly[:, 0] -= before[i]
    out, size = np.zeros(len(x), complex), np.zeros(len(x))
    for d, weight in enumerate(weights):
        term = poly[:, d] * factorial(d) * x ** (d + 1) * weight
        out += term
        size += np.abs(term)
    for k in range(line.coeff.shape[2]):
        c, rate = line.coeff[piece, i, k], line.exponent[piece, i, k]
        if not c.any():
            continue
        for share, own in ((c / 2, rate), (np.conj(c) / 2, np.conj(rate))):
            term = share * _both(pole, own, x)
            out += term
            size += np.abs(term)
    return out, size


def _both(pole: complex, rate: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Integral of exp(pole (x - xi) + rate xi) over 0 < xi < x, also where both rates meet."""
    apart = rate - pole
    near = np.abs(apart * x) < 1.0
    first = _weights(np.where(near, apart * x, 0.0))[0]
    free = np.exp(pole * x)
    return np.where(near, free * x * first, (np.exp(rate * x) - free) / np.where(near, 1.0, apart))


def _weights(z: np.ndarray) -> list[np.ndarray]:
    """phi_1 to phi_4, phi_k(z) = sum z^j / (j + k)!."""
    small = np.abs(z) < 1.0
    near, far = np.where(small, z, 0.0), np.where(small, 1.0, z)
    out, last = [], np.exp(far)
    for k in range(1, 5):
        last = (last - 1.0 / factorial(k - 1)) / far
        series = np.zeros_like(near)
        for j in range(_SERIES, -1, -1):
            series = series * near + 1.0 / factorial(j + k)
        out.append(np.where(small, series, last))
    return out


