"""The gap as the contract states it, in plain SI, and its closed-form steady flow."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

WALLS = {"plates": ("lower", "upper"), "pipe": ("axis", "bore"), "axial": ("inner", "outer"),
         "rotating": ("inner", "outer")}  # fmt: skip


@dataclass(frozen=True)
class Gap:
    """``kind`` "plates", "pipe", "axial", "rotating"; ends ``ri`` < ``ro`` m; ``rho``, ``mu``; slip lengths m;
    ``free`` (two flags): shear-free ends.  A pipe's inner end is its axis."""

    kind: str
    ri: float
    ro: float
    rho: float
    mu: float
    slip: tuple[float, float] = (0.0, 0.0)
    free: tuple[bool, bool] = (False, False)

    @property
    def names(self) -> tuple[str, str]:
        """Wall names, inner end first."""
        return WALLS[self.kind]

    @property
    def nu(self) -> float:
        """Kinematic viscosity."""
        return self.mu / self.rho

    @property
    def time(self) -> float:
        """Diffusion time over the whole gap."""
        return (self.ro - self.ri) ** 2 / self.nu

    @property
    def memory(self) -> float:
        """Time after which every transient is below 1e-17 of its start: the slowest mode's rate is at least
        5.78/time (pipe: first zero of J0 squared), about pi^2/4 with a shear-free end (slip lies between)."""
        return (20.0 if any(self.free) or any(self.slip) else 7.5) * self.time


def gap_of(case: dict[str, Any]) -> Gap:
    """The gap of a plain case."""
    kind = case["shape"] if case["shape"] != "annulus" else case["motion"]
    if kind == "plates":
        ri, ro = 0.0, case["height"]
    elif kind == "pipe":
        ri, ro = 0.0, case["radius"]
    else:
        ri, ro = case["inner_radius"], case["outer_radius"]
    walls = [case.get("walls", {}).get(name, {}) for name in WALLS[kind]]
    slip = tuple(float(w.get("slip_length", 0.0)) for w in walls)
    free = tuple(bool(w.get("shear_free", False)) for w in walls)
    return Gap(kind, ri, ro, case["density"], case["viscosity"], slip, free)  # type: ignore[arg-type]


def steady(gap: Gap, r: np.ndarray) -> np.ndarray:
    """Steady response to unit inputs: (3, 3 + len(r)), rows inner speed, outer speed, pressure drop per length;
    columns inner stress, outer stress, mean velocity, w(r).  Elementary integration of the momentum equation."""
    r = np.asarray(r, dtype=float)
    ends = np.array([gap.ri, gap.ro])
    w1, d1, p, dp = _steady_basis(gap, ends)
    rows, sides = [], (1.0, -1.0)
    for k, sign in enumerate(sides):
        own = (0.0, 1.0, 0.0) if gap.free[k] else (1.0, -sign * gap.slip[k], 1.0)
        rows.append((own[0], own[0] * w1[k] + own[1] * d1[k], own[0] * p[k] + own[1] * dp[k], own[2]))
    if gap.kind == "pipe":
        rows[0] = (0.0, 1.0, 0.0, 0.0)
    matrix = np.array([[rows[0][0], rows[0][1]], [rows[1][0], rows[1][1]]])
    right = np.array([[rows[0][3], 0.0], [0.0, rows[1][3]], [-rows[0][2], -rows[1][2]]])
    coef = np.linalg.solve(matrix, right.T).T  # (3 inputs, 2)
    unit = np.array([0.0, 0.0, 1.0])
    slope = coef[:, 1:] * d1 + unit[:, None] * dp
    lever = ends if gap.kind == "rotating" else np.ones(2)
    stress = gap.mu * lever * slope * np.array([1.0, -1.0])
    if gap.kind == "pipe":
        stress[:, 0] = 0.0
    x, wt = np.polynomial.legendre.leggauss(60)
    rq = gap.ri + (gap.ro - gap.ri) * (x + 1) / 2 if gap.ri == 0 else gap.ri * (gap.ro / gap.ri) ** ((x + 1) / 2)
    wt = wt / 2 * ((gap.ro - gap.ri) if gap.ri == 0 else rq * np.log1p((gap.ro - gap.ri) / gap.ri))
    weight = rq if gap.kind != "plates" else np.ones_like(rq)
    area = {"plates": gap.ro - gap.ri, "rotating": gap.ro - gap.ri}.get(gap.kind, (gap.ro**2 - gap.ri**2) / 2)
    mean = _steady_profile(gap, coef, rq) @ (wt * weight) / area
    return np.concatenate([stress, mean[:, None], _steady_profile(gap, coef, r)], axis=1)


def _steady_profile(gap: Gap, coef: np.ndarray, r: np.ndarray) -> np.ndarray:
    w1, _, p, _ = _steady_basis(gap, r)
    return coef[:, :1] + coef[:, 1:] * w1 + np.array([[0.0], [0.0], [1.0]]) * p


def _steady_basis(gap: Gap, r: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Second homogeneous solution (the first is 1), its slope, the particular one of unit drop, its slope."""
    if gap.kind == "plates":
        return r, np.ones_like(r), -(r**2) / (2 * gap.mu), -r / gap.mu
    if gap.kind == "pipe":  # no second regular solution: a column of zeros with unit slope is solved to zero
        return np.zeros_like(r), np.where(r == 0.0, 1.0, 0.0), -(r**2) / (4 * gap.mu), -r / (2 * gap.mu)
    if gap.kind == "axial":
        rise = np.log1p((r - gap.ri) / gap.ri)
        return rise, 1 / r, -(r - gap.ri) * (r + gap.ri) / (4 * gap.mu), -r / (2 * gap.mu)
    fall = (r - gap.ri) * (r + gap.ri) / (r * gap.ri) ** 2
    return fall, 2 / r**3, np.zeros_like(r), np.zeros_like(r)
