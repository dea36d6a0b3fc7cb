"""The same answers at thirty digits, slowly: fixed Talbot contour in mpmath, break by break, textbook functions.

Abate & Valko, Int. J. Numer. Meth. Eng. 60 (2004) 979: f(t) from M nodes with about 0.6 M digits.  Nothing is
scaled and nothing is skipped: onset minus end of every piece, Bessel functions as they stand.
"""

from __future__ import annotations

import mpmath as mp

from .drives import Piece
from .gap import Gap

NODES = 44
DIGITS = 45


def transfer(gap: Gap, s: mp.mpc, row: int, channel: int, r: float = 0.0) -> mp.mpc:
    """Unit input ``row`` to ``channel`` (0, 1: stresses; 2: mean velocity; 3: velocity at ``r``)."""
    q = mp.sqrt(s * mp.mpf(gap.rho) / mp.mpf(gap.mu))
    a, b = mp.mpf(gap.ri), mp.mpf(gap.ro)
    if row == 2:
        return _pressed(gap, s, q, a, b, channel, r)
    return _driven(gap, s, q, a, b, row, channel, r)


def _pressed(gap: Gap, s, q, a, b, channel, r):
    free = 1 / (gap.rho * s)
    one = 0 if channel in (0, 1) else 1
    return free * (one - sum(_driven(gap, s, q, a, b, k, channel, r) for k in (0, 1)))


def _pair(gap: Gap, q, r):
    """Values, slopes and mean's primitives of both solutions at r."""
    z = q * r
    if gap.kind == "plates":
        up, down = mp.exp(q * (r - gap.ro)), mp.exp(-z)
        return (up, q * up, up / q), (down, -q * down, -down / q)
    if gap.kind in ("axial", "pipe"):
        grow = (mp.besseli(0, z), q * mp.besseli(1, z), r * mp.besseli(1, z) / q)
        if gap.kind == "pipe":
            return grow, (0, 0, 0)
        return grow, (mp.besselk(0, z), -q * mp.besselk(1, z), -r * mp.besselk(1, z) / q)
    return (
        (mp.besseli(1, z) / r, q * mp.besseli(2, z) / r, mp.besseli(0, z) / q),
        (mp.besselk(1, z) / r, -q * mp.besselk(2, z) / r, -mp.besselk(0, z) / q),
    )


def _driven(gap: Gap, s, q, a, b, row, channel, r):
    if gap.kind == "pipe":
        if row == 0:
            return mp.mpf(0)
        outer = _pair(gap, q, b)[0]
        c, d = 1 / (outer[0] + gap.slip[1] * outer[1]), 0
    else:
        m = [_condition(gap, k, _pair(gap, q, x)) for k, x in enumerate((a, b))]
        det = m[0][0] * m[1][1] - m[0][1] * m[1][0]
        on = 0 if gap.free[row] else 1
        c, d = (m[1][1] * on / det, -m[1][0] * on / det) if row == 0 else (-m[0][1] * on / det, m[0][0] * on / det)
    if channel == 3:
        p = _pair(gap, q, mp.mpf(r))
        return c * p[0][0] + d * p[1][0]
    if channel == 2:
        up = _pair(gap, q, b)
        low = _pair(gap, q, a) if gap.kind != "pipe" else ((0, 0, 0), (0, 0, 0))
        area = b - a if gap.kind in ("plates", "rotating") else (b**2 - a**2) / 2
        return (c * (up[0][2] - low[0][2]) + d * (up[1][2] - low[1][2])) / area
    if gap.kind == "pipe" and channel == 0:
        return mp.mpf(0)
    x = (a, b)[channel]
    p = _pair(gap, q, x)
    lever = x if gap.kind == "rotating" else 1
    return (1, -1)[channel] * gap.mu * lever * (c * p[0][1] + d * p[1][1])


def _condition(gap: Gap, k: int, pair):
    if gap.free[k]:
        return pair[0][1], pair[1][1]
    side = (1, -1)[k]
    return tuple(p[0] - side * mp.mpf(gap.slip[k]) * p[1] for p in pair)


def _talbot(image, t):
    """Inverse transform of a real function at t."""
    r = mp.mpf(2) * NODES / (5 * t)
    total = (mp.exp(r * t) * image(r)).real / 2
    for k in range(1, NODES):
        theta = mp.pi * k / NODES
        cot = mp.cot(theta)
        s = r * theta * mp.mpc(cot, 1)
        slope = theta + (theta * cot - 1) * cot
        total += (mp.exp(t * s) * image(s) * mp.mpc(1, slope)).real
    return total * r / NODES


def _onset(gap: Gap, piece: Piece, shift: float, x, row: int, channel: int, r: float, jump: float):
    """Answer at x after the drive took up this piece's continuation at ``shift`` into it; value part is ``jump``."""
    slopes = []
    poly = [mp.mpf(c) for c in piece.poly]
    for k in range(1, len(poly)):
        slopes.append(sum(mp.mpf(shift) ** (n - k) * poly[n] * mp.ff(n, k) for n in range(k, len(poly))))
    waves = [(mp.mpc(c) * mp.exp(mp.mpc(g) * shift), mp.mpc(g)) for c, g in piece.waves]
    fixed = [(c, g, transfer(gap, g, row, channel, r) if g.imag else mp.mpf(0)) for c, g in waves]

    def image(s):
        h = transfer(gap, s, row, channel, r)
        total = h * mp.mpf(jump) / s
        for k, slope in enumerate(slopes, start=1):
            total += h * slope / s ** (k + 1)
        for c, g, hg in fixed:
            total += (c * (h - hg) / (s - g) + mp.conj(c) * (h - mp.conj(hg)) / (s - mp.conj(g))) / 2
            total -= h * c.real / s
        return total

    return _talbot(image, x) + sum((c * hg * mp.exp(g * x)).real for c, g, hg in fixed)


def state(
    gap: Gap, inputs: list[list[tuple[list[Piece], float]]], t: float, channel: int, steady, r: float = 0.0
) -> float:
    """One channel at one time; ``inputs`` as in ``laplace.Response.histories``, ``steady`` its steady matrix column."""
    with mp.workdps(DIGITS):
        total = mp.mpf(0)
        for row, chain in enumerate(inputs):
            for pieces, before in chain:
                total += before * mp.mpf(float(steady[row]))
                was = before
                for p in pieces:
                    jump = float(p.value(p.start)) - was
                    if t > p.start:
                        total += _onset(gap, p, 0.0, mp.mpf(t) - p.start, row, channel, r, jump)
                    if t > p.end:
                        total -= _onset(gap, p, p.end - p.start, mp.mpf(t) - p.end, row, channel, r, 0.0)
                    was = float(p.value(p.end)) if p.end < float("inf") else 0.0
        return float(total)
