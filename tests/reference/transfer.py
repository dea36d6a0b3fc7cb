"""Transfer functions in Laplace space in double precision: unit wall speeds and unit pressure drop per length
to wall stresses, mean velocity and velocity, for every shape.

Plates: hyperbolic functions.  Pipe: I0.  Axial annulus: I0, K0.  Rotating annulus: I1, K1 over r.  All as scaled
functions; for large arguments Hankel's expansions (DLMF 10.40.1 and 10.40.2), whose exponents are taken from the
distance to the wall, so that a nearly closed annulus loses no digits.
"""

from __future__ import annotations

import numpy as np
from scipy.special import ive, kve

from .gap import Gap

LARGE = 30.0  # above it 22 terms of Hankel's expansion reach round-off
TERMS = 22


def _hankel(order: int, sign: float) -> np.ndarray:
    """Coefficients of (sign / z)^k in Hankel's expansion (DLMF 10.17.1)."""
    out, a = [1.0], 1.0
    for k in range(1, TERMS):
        a *= (4.0 * order**2 - (2 * k - 1) ** 2) / (8.0 * k)
        out.append(a * sign**k)
    return np.array(out)


def growing(order: int, z: np.ndarray, exponent: np.ndarray, large: np.ndarray) -> np.ndarray:
    """I_order(z) e^(exponent - z), or where ``large`` its exponentially growing part (a cross-product's twin)."""
    out = np.empty_like(z)
    zl = z[large]
    out[large] = np.polynomial.polynomial.polyval(1 / zl, _hankel(order, -1.0)) / np.sqrt(2 * np.pi * zl)
    zs = z[~large]
    out[~large] = ive(order, zs) * np.exp(-1j * zs.imag)
    return out * np.exp(exponent)


def falling(order: int, z: np.ndarray, exponent: np.ndarray, large: np.ndarray) -> np.ndarray:
    """K_order(z) e^(z + exponent)."""
    out = np.empty_like(z)
    zl = z[large]
    out[large] = np.polynomial.polynomial.polyval(1 / zl, _hankel(order, 1.0)) * np.sqrt(np.pi / (2 * zl))
    out[~large] = kve(order, z[~large])
    return out * np.exp(exponent)


def _basis(gap: Gap, q: np.ndarray, r: np.ndarray) -> tuple[np.ndarray, ...]:
    """Growing and falling solutions at ``r`` (M, 1) for ``q`` (1, N): values, slopes, and the primitives of
    r^n w / (weight of the mean), each (M, N)."""
    up, down = q * (r - gap.ro), -q * (r - gap.ri)
    if gap.kind == "plates":
        p, d = np.exp(up), np.exp(down)
        return p, q * p, d, -q * d
    z = q * r
    if gap.kind == "pipe":  # beyond this no trace of the falling part is left at the nodes that are used
        large = np.broadcast_to((np.abs(q * gap.ro) > 60.0) & ((q * gap.ro).real > 20.0) & (z.real > 20.0), z.shape)
        none = np.zeros_like(z)
        return growing(0, z, up, large), q * growing(1, z, up, large), none, none
    large = np.broadcast_to(np.abs(q * gap.ri) > LARGE, z.shape)
    if gap.kind == "axial":
        return (
            growing(0, z, up, large),
            q * growing(1, z, up, large),
            falling(0, z, down, large),
            -q * falling(1, z, down, large),
        )
    return (
        growing(1, z, up, large) / r,
        q * growing(2, z, up, large) / r,
        falling(1, z, down, large) / r,
        -q * falling(2, z, down, large) / r,
    )


def transfer(gap: Gap, s: np.ndarray, r: np.ndarray) -> np.ndarray:
    """(3, 3 + len(r), len(s)) complex: as in ``gap.steady``, at the Laplace variables ``s``."""
    q = np.sqrt(s / gap.nu)[None, :]
    points = np.concatenate([[gap.ri, gap.ro], np.asarray(r, dtype=float)])[:, None]
    if gap.kind == "pipe":
        points = np.maximum(points, 1e-300)
    p, dp, d, dd = _basis(gap, q, points)
    coef = _coefficients(gap, p[:2], dp[:2], d[:2], dd[:2])
    w = np.stack([a * p + b * d for a, b in coef])  # (2, M, N)
    slope = np.stack([a * dp[:2] + b * dd[:2] for a, b in coef])
    lever = points[:2] if gap.kind == "rotating" else np.ones((2, 1))
    stress = gap.mu * lever * slope * np.array([1.0, -1.0])[:, None]
    if gap.kind == "pipe":
        stress[:, 0] = 0.0
    pressed = (0.0 if gap.kind == "rotating" else 1.0) / (gap.rho * s)  # no pressure drives a rotating gap
    w = np.concatenate([w, [pressed * (1.0 - w[0] - w[1])]])
    stress = np.concatenate([stress, [-pressed * (stress[0] + stress[1])]])
    slope = np.concatenate([slope, [-pressed * (slope[0] + slope[1])]])
    mean = _mean(gap, s, q, coef, slope, points[:2])
    return np.concatenate([stress, mean[:, None], w[:, 2:]], axis=1)


def _coefficients(gap: Gap, p: np.ndarray, dp: np.ndarray, d: np.ndarray, dd: np.ndarray) -> list[tuple]:
    rows = []
    for k, side in enumerate((1.0, -1.0)):
        if gap.free[k]:
            rows.append((dp[k], dd[k], 0.0))
        else:
            rows.append((p[k] - side * gap.slip[k] * dp[k], d[k] - side * gap.slip[k] * dd[k], 1.0))
    (a, b, on0), (c, e, on1) = rows
    if gap.kind == "pipe":
        zero = np.zeros_like(c)
        return [(zero, zero), (on1 / c, zero)]
    det = a * e - b * c
    return [(on0 * e / det, -on0 * c / det), (-on1 * b / det, on1 * a / det)]


def _mean(
    gap: Gap, s: np.ndarray, q: np.ndarray, coef: list[tuple], slope: np.ndarray, ends: np.ndarray
) -> np.ndarray:
    """Mean velocity from the momentum of the whole gap; in a rotating gap from the integral of I1 and K1."""
    if gap.kind == "rotating":
        large = np.broadcast_to(np.abs(q * gap.ri) > LARGE, (2, len(s)))
        up = growing(0, q * ends, q * (ends - gap.ro), large)
        down = falling(0, q * ends, -q * (ends - gap.ri), large)
        out = [(a * (up[1] - up[0]) - b * (down[1] - down[0])) / (q[0] * (gap.ro - gap.ri)) for a, b in coef]
        return np.stack([*out, np.zeros_like(s)])
    n = 0 if gap.kind == "plates" else 1
    area = (gap.ro ** (n + 1) - gap.ri ** (n + 1)) / (n + 1) if n == 0 else (gap.ro - gap.ri) * (gap.ro + gap.ri) / 2
    flux = gap.nu * (ends[1] ** n * slope[:, 1] - (ends[0] ** n * slope[:, 0] if gap.kind != "pipe" else 0.0)) / area
    flux[2] += 1.0 / gap.rho
    return flux / s
