"""A second judge, unrelated to the first: Chebyshev collocation across the gap, SciPy's Radau in time.

Trefethen, Spectral Methods in MATLAB (2000), program cheb, for the matrices; Hairer & Wanner's Radau IIA of order 5
as in SciPy.  Walls are prescribed, every break is landed on.  A pipe is solved in r squared, where it is regular.
"""

from __future__ import annotations

import cmath
import itertools
from typing import Any

import numpy as np
from scipy.integrate import solve_ivp

from .drives import Signal, signal
from .gap import Gap, gap_of, steady


def cheb(n: int) -> tuple[np.ndarray, np.ndarray]:
    """(first derivative (n+1, n+1), points from -1 to 1)."""
    x = -np.cos(np.pi * np.arange(n + 1) / n)
    c = np.where((np.arange(n + 1) == 0) | (np.arange(n + 1) == n), 2.0, 1.0) * (-1.0) ** np.arange(n + 1)
    dx = x[:, None] - x[None, :]
    d = np.outer(c, 1 / c) / (dx + np.eye(n + 1))
    return d - np.diag(d.sum(axis=1)), x


class Collocation:
    """One gap on Chebyshev points."""

    def __init__(self, gap: Gap, n: int):
        self.gap = gap
        d, x = cheb(n)
        self.z = (x + 1) / 2  # share of the gap, or of the radius squared in a pipe
        if gap.kind == "pipe":
            self.r = gap.ro * np.sqrt(self.z)
            dz = 2 * d
            self.operator = 4 / gap.ro**2 * (self.z[:, None] * (dz @ dz) + dz)
            self.slope = 2 * self.r[:, None] / gap.ro**2 * dz
        else:
            self.r = gap.ri + (gap.ro - gap.ri) * self.z
            self.slope = 2 / (gap.ro - gap.ri) * d
            m = {"plates": 0, "axial": 1, "rotating": 3}[gap.kind]
            self.operator = self.slope @ self.slope + (m / self.r[:, None] * self.slope if m else 0.0)

    def stress(self, w: np.ndarray) -> np.ndarray:
        """(2,) wall stresses."""
        lever = self.r if self.gap.kind == "rotating" else np.ones_like(self.r)
        out = self.gap.mu * np.array([lever[0] * (self.slope[0] @ w), -lever[-1] * (self.slope[-1] @ w)])
        if self.gap.kind == "pipe":
            out[0] = 0.0
        return out

    def march(self, signals: list[Signal], before: np.ndarray, times: np.ndarray) -> np.ndarray:
        """Stresses (n, 2) at ``times``; ``before`` (3,) the inputs whose steady flow comes first."""
        gap = self.gap
        w = before @ steady(gap, np.maximum(self.r, 1e-12 * gap.ro))[:, 3:]
        first = 0 if gap.kind == "pipe" else 1
        free = slice(first, len(w) - 1)
        linear = gap.nu * self.operator
        until = float(times[-1])
        edges = np.unique(np.concatenate([s.breaks(until) for s in signals] + [[until]]))
        edges = edges[np.concatenate([[True], np.diff(edges) > 1e-12 * until])]
        out = np.full((len(times), 2), np.nan)
        for a, b in itertools.pairwise(edges):
            ends = [_within(s, a, b) for s in signals]

            def whole(t: float, inner: np.ndarray, ends: list = ends) -> np.ndarray:
                left = [ends[0](t)] if first else []
                return np.concatenate([left, inner, [ends[1](t)]])

            def rate(t: float, inner: np.ndarray, ends: list = ends, whole: Any = whole) -> np.ndarray:
                return (linear @ whole(t, inner))[free] + ends[2](t) / gap.rho

            inside = np.flatnonzero((times > a) & (times <= b * (1 + 1e-14)))
            scale = max(np.abs(w).max(), abs(ends[0](b)), abs(ends[1](b)), abs(ends[2](b)) * gap.time / gap.rho / 10)
            scale = max(scale, abs(ends[0]((a + b) / 2)), abs(ends[1]((a + b) / 2)))
            run = solve_ivp(
                rate, (a, b), w[free], "Radau", t_eval=np.unique(np.append(np.minimum(times[inside], b), b)),
                rtol=3e-10, atol=3e-12 * scale, jac=linear[free, free], first_step=(b - a) * 1e-6,
            )  # fmt: skip
            if not run.success:
                raise ArithmeticError(run.message)
            for k, t in zip(inside, np.minimum(times[inside], b), strict=True):
                at = int(np.argmin(np.abs(run.t - t)))
                out[k] = self.stress(whole(run.t[at], run.y[:, at]))
            w = whole(b, run.y[:, -1])
        return out


def _within(s: Signal, a: float, b: float) -> Any:
    middle = (a + b) / 2
    owners = [[p for p in atom.expand(0.0, b) if p.start <= middle][-1] for atom in s.atoms]
    waves = [(c, sigma, p.start) for p in owners for c, sigma in p.waves]
    cubics = [(*(*p.poly, 0.0, 0.0, 0.0, 0.0)[:4], p.start) for p in owners]

    def value(t: float) -> float:
        out = 0.0
        for c0, c1, c2, c3, start in cubics:
            x = t - start
            out += c0 + x * (c1 + x * (c2 + x * c3))
        for c, sigma, start in waves:
            out += (c * cmath.exp(sigma * (t - start))).real
        return out

    return value


def stresses(case: dict[str, Any], times: np.ndarray, n: int = 32) -> np.ndarray:
    """Wall stresses (n, 2) of a plain case without slip at ``times``."""
    gap = gap_of(case)
    walls = [case.get("walls", {}).get(name, {}) for name in gap.names]
    histories = [w.get("speed") for w in walls] + [case.get("pressure")]
    signals = [signal(h) for h in histories]
    steady_start = case.get("start", "rest") == "steady"
    before = [
        (s.before if isinstance(h, dict) or h is None else h) if steady_start else 0.0
        for s, h in zip(signals, histories, strict=True)
    ]
    return Collocation(gap, n).march(signals, np.array(before), np.asarray(times, dtype=float))
