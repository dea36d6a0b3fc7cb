"""Nodes across the gap that resolve layers at the walls, and the largest magnitude between them."""

from __future__ import annotations

import itertools

import numpy as np
from scipy.interpolate import BarycentricInterpolator

from .gap import Gap

PANELS = (0.0, 2e-3, 0.02, 0.12, 0.5, 0.88, 0.98, 0.998, 1.0)
NODES = 11
FINE = 33
RESOLVED = 1e-4  # of the largest: panels whose last coefficients are smaller are taken as they are
RINGING = 3.0  # times the last coefficients: a rise above the nodes of no more than this may be ringing


class Profile:
    """Chebyshev nodes ``r`` on panels; ``largest`` reads the maximum of |w| from values there."""

    def __init__(self, gap: Gap):
        edges = PANELS if gap.kind != "pipe" else (0.0, 0.3, *PANELS[4:])
        x = -np.cos(np.pi * np.arange(NODES) / (NODES - 1))
        fine = np.linspace(-1.0, 1.0, FINE)
        one = BarycentricInterpolator(x, np.eye(NODES))(fine)
        z = [lo + (hi - lo) * (x + 1) / 2 for lo, hi in itertools.pairwise(edges)]
        self.r = gap.ri + (gap.ro - gap.ri) * np.concatenate(z)
        # the last two Chebyshev coefficients: where they are not small, a wall has just jumped and the polynomial rings
        self._last = np.linalg.inv(np.polynomial.chebyshev.chebvander(x, NODES - 1))[-2:]
        self._at_nodes = self.r if gap.kind == "rotating" else np.ones_like(self.r)
        self._to_fine = np.kron(np.eye(len(edges) - 1), one)
        lever = np.concatenate([lo + (hi - lo) * (fine + 1) / 2 for lo, hi in itertools.pairwise(edges)])
        self.fine = gap.ri + (gap.ro - gap.ri) * lever
        self.lever = self.fine if gap.kind == "rotating" else np.ones_like(self.fine)

    def values(self, w: np.ndarray) -> np.ndarray:
        """Velocity (tangential in a rotating gap) at ``fine`` from w at ``r`` (nodes, n)."""
        return self.lever[:, None] * (self._to_fine @ w)

    def largest(self, w: np.ndarray) -> np.ndarray:
        """Maximum over the gap of |velocity| (n,), between the fine points by a parabola."""
        u = np.abs(self.values(w)).reshape(-1, FINE, w.shape[1])
        nodes = np.abs(self._at_nodes[:, None] * w).reshape(-1, NODES, w.shape[1])
        tail = np.abs(np.tensordot(self._last, w.reshape(-1, NODES, w.shape[1]), axes=(1, 1))).max(axis=0)
        rings = RINGING * tail * self.lever.max() > u.max(axis=1) - nodes.max(axis=1)
        rings &= tail > RESOLVED * np.abs(w).max(axis=0)
        u = np.where(rings[:, None, :], np.minimum(u, nodes.max(axis=1, keepdims=True)), u)
        top = u.argmax(axis=1, keepdims=True)
        inner = np.clip(top, 1, FINE - 2)
        a, b, c = (np.take_along_axis(u, inner + k, axis=1)[:, 0] for k in (-1, 0, 1))
        bend = np.minimum(a - 2 * b + c, 0.0)
        with np.errstate(divide="ignore", invalid="ignore"):
            shift = np.where(bend < 0.0, 0.5 * (a - c) / bend, 0.0)
            rise = np.where((np.abs(shift) <= 1.0) & (bend < 0) & ~rings, b - 0.25 * (a - c) * shift, 0.0)
        return np.maximum(rise, u.max(axis=1)).max(axis=0)
