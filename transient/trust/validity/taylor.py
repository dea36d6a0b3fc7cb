"""Taylor number: does the flow between rotating cylinders break up into vortices?"""

from __future__ import annotations

import numpy as np

from transient.gap.problem import LOWER, UPPER, Problem
from transient.result.history import History
from transient.trust.check import NEAR, Check, judge

# Critical Omega R1 d / nu with the outer cylinder at rest, by radius ratio: DiPrima & Swinney 1981, from memory;
# an eigenvalue solution of the linear stability equations gives the same digits.
RATIO = np.array([0.5, 0.75, 0.9, 0.95, 0.975])
CRITICAL_REYNOLDS = np.array([68.19, 85.78, 131.6, 185.0, 261.0])
# Limit of Omega^2 R1 d^3 / nu^2 for a vanishing gap, outer cylinder at rest (computed).
NARROW = 1694.95
SOURCE = (
    "DiPrima & Swinney 1981 for the inner cylinder turning (from memory), narrow gap 1694.95; "
    "angular momentum difference after Rayleigh 1917 for other motions"
)
# Profiles and nodes looked at, so that the cost stays small on fine grids.
MOST_NODES, MOST_PROFILES = 32, 64


def critical_taylor(ratio: np.ndarray | float) -> np.ndarray:
    """Critical Omega^2 R1 d^3 / nu^2 by ``ratio`` R1/R2: interpolated between the table and the narrow gap.

    The logarithm is nearly straight over log(ratio).  Below ratio 0.5, where there is no table, the critical Reynolds
    number of ratio 0.5 less 1 % is kept: by the eigenvalue solution it is never lower there.
    """
    ratio = np.asarray(ratio, dtype=float)
    known = np.append(CRITICAL_REYNOLDS**2 * (1.0 - RATIO) / RATIO, NARROW)
    inside = np.exp(np.interp(np.log(ratio), np.log(np.append(RATIO, 1.0)), np.log(known)))
    wide = (0.99 * CRITICAL_REYNOLDS[0]) ** 2 * (1.0 - ratio) / ratio
    return np.where(ratio < RATIO[0], wide, inside)


def _excess(inner: np.ndarray, outer: np.ndarray) -> np.ndarray:
    """How far the squared angular momentum falls outwards.

    Against rotation the other way it counts from zero, plus a tenth: slow counter-rotation lowers the critical
    speed a little (by 3 % at ratio 0.5, from the eigenvalue solution).
    """
    return np.where(inner * outer < 0.0, 1.1 * inner**2, np.maximum(inner**2 - outer**2, 0.0))


def taylor_ratio(r: np.ndarray, omega: np.ndarray, kinematic: float) -> float:
    """Largest share of the critical Taylor number over all layers of the profiles.

    ``r`` (N,) m, ``omega`` (k, N) rad/s, ``kinematic`` m^2/s.  A layer from r_i to r_j counts as a gap of its own with
    Omega^2 = (L_i^2 - L_j^2)/r_i^4, L = r^2 omega: the usual number where the outer cylinder rests, none where the
    angular momentum grows outwards (Rayleigh), and the layer at a stopping outer wall is not overlooked.
    """
    momentum = omega * r**2
    i, j = np.triu_indices(len(r), 1)
    fall = _excess(momentum[:, i], momentum[:, j]).max(axis=0)
    number = fall * (r[j] - r[i]) ** 3 / (r[i] ** 3 * kinematic**2)
    return float((number / critical_taylor(r[i] / r[j])).max())


def taylor(problem: Problem, history: History) -> Check | None:
    """Taylor number Omega^2 R1 d^3 / nu^2 of the worst layer and instant, scaled to the whole gap."""
    if not problem.rotating:
        return None
    nodes = np.unique(np.linspace(0, len(history.position) - 1, MOST_NODES).astype(int))
    rows = np.unique(np.linspace(0, len(history.profile) - 1, MOST_PROFILES).astype(int))
    kinematic = problem.viscosity / problem.density
    share = taylor_ratio(history.position[nodes], history.profile[np.ix_(rows, nodes)], kinematic)
    ends = np.array([problem.inner, problem.outer])
    share = max(share, taylor_ratio(ends, history.speed[:, [LOWER, UPPER]], kinematic))
    limit = float(critical_taylor(problem.inner / problem.outer))
    value = share * limit
    status = judge(value, NEAR * limit, limit)
    words = {
        "pass": "no vortices: the angular momentum falls outwards too little, or not at all",
        "caution": "close to the onset of vortices between the cylinders",
        "fail": "vortices form between the cylinders; the answer does not apply",
    }
    return Check("Taylor number", "validity", status, value, limit, SOURCE, words[status])
