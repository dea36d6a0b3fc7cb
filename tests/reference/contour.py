"""Inverse Laplace transform on a hyperbola, one contour for a whole window of times.

Weideman & Trefethen, Math. Comp. 76 (2007) 1341: z = mu (1 + sin(i theta - alpha)), parameters for t in [t0, L t0].
"""

from __future__ import annotations

import numpy as np
from scipy.optimize import minimize_scalar

WINDOW = 2.5  # ratio of the last to the first time served by one contour
NODES = 26  # conjugate pairs


def _spread(alpha: float, ratio: float) -> float:
    return float(np.arccosh(((np.pi - 2 * alpha) * ratio + 4 * alpha - np.pi) / ((4 * alpha - np.pi) * np.sin(alpha))))


def hyperbola(ratio: float = WINDOW, nodes: int = NODES) -> tuple[np.ndarray, np.ndarray]:
    """(s, weight) for times in [1, ratio]: f(t) = Re sum weight e^(s t) F(s), for real f."""
    best = minimize_scalar(
        lambda a: -(np.pi**2 - 2 * np.pi * a) / _spread(a, ratio), bounds=(np.pi / 4 + 1e-3, np.pi / 2 - 1e-3),
        method="bounded",
    )  # fmt: skip
    alpha = float(best.x)
    spread = _spread(alpha, ratio)
    step = spread / nodes
    mu = (4 * np.pi * alpha - np.pi**2) / spread * nodes / ratio
    theta = (np.arange(nodes) + 0.5) * step
    s = mu * (1 + np.sin(1j * theta - alpha))
    return s, step / (np.pi * 1j) * (1j * mu * np.cos(1j * theta - alpha))
