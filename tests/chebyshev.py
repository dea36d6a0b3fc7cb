"""An independent answer for small cases: collocation on Chebyshev points, exact in time through the matrix's modes.

Shares nothing with the solver or its series but the drives' pieces.  Accurate to 1e-9 and better except right after a
break.  Method: Trefethen, Spectral Methods in MATLAB (2000), chapters 6 and 11 (from memory); a pipe is solved on its
diameter so that the axis needs no condition.
"""

from __future__ import annotations

import numpy as np
from scipy.interpolate import BarycentricInterpolator

from transient.gap.problem import Problem


def differentiation(n: int) -> tuple[np.ndarray, np.ndarray]:
    """(points (n + 1,) from 1 to -1, first-derivative matrix) on Chebyshev points (Trefethen's ``cheb``)."""
    x = np.cos(np.pi * np.arange(n + 1) / n)
    c = np.ones(n + 1)
    c[[0, -1]] = 2.0
    c *= (-1.0) ** np.arange(n + 1)
    gap = x[:, None] - x[None, :]
    matrix = np.outer(c, 1.0 / c) / (gap + np.eye(n + 1))
    return x, matrix - np.diag(matrix.sum(axis=1))


class Collocation:
    """The flow of ``problem`` with no-slip walls on ``n`` + 1 points."""

    def __init__(self, problem: Problem, until: float, n: int = 47):
        self.problem, self.inputs = problem, problem.inputs(until)
        x, first = differentiation(n)
        pipe = problem.walls[0].kind == "axis"
        low, high = (-problem.outer, problem.outer) if pipe else (problem.inner, problem.outer)
        self.r = low + (high - low) * (x + 1.0) / 2.0
        self.first = first * 2.0 / (high - low)
        m, nu = problem.metric, problem.viscosity / problem.density
        operator = nu * (self.first @ self.first)
        if m:
            operator = operator + nu * m / self.r[:, None] * self.first
        inner = slice(1, -1)
        rate, modes = np.linalg.eig(operator[inner, inner])
        back = np.linalg.inv(modes)
        ends = np.stack([operator[inner, -1], operator[inner, 0], np.full(n - 1, 1.0 / problem.density)], axis=1)
        if pipe:  # both ends of the diameter are the bore
            ends[:, 1] += ends[:, 0]
            ends[:, 0] = 0.0
        self.pipe, self.rate, self.modes, self.source = pipe, rate, modes, back @ ends
        self.starts = self._march(back)

    def _march(self, back: np.ndarray) -> list[np.ndarray]:
        """Amplitudes of the modes at every piece's start."""
        before = self.inputs.before if self.problem.start == "steady" else np.zeros(3)
        state = -(self.source @ before) / self.rate
        out = [state]
        for piece, length in enumerate(np.diff(self.inputs.starts)):
            out.append(self._amplitudes(piece, np.array([length]), out[-1])[0])
        return out

    def _amplitudes(self, piece: int, x: np.ndarray, state: np.ndarray) -> np.ndarray:
        at, begin = self._particular(piece, x), self._particular(piece, np.zeros(1))
        return at + (state - begin) * np.exp(self.rate * x[:, None])

    def _particular(self, piece: int, x: np.ndarray) -> np.ndarray:
        """(len(x), modes): the answer to the piece's polynomial and exponential terms."""
        out = np.zeros((len(x), len(self.rate)), complex)
        for row in range(3):
            poly = np.polynomial.Polynomial(self.inputs.poly[piece, row])
            for order in range(4):
                out -= poly.deriv(order)(x)[:, None] * self.source[:, row] / self.rate ** (order + 1)
            for c, s in zip(self.inputs.coeff[piece, row], self.inputs.rate[piece, row], strict=True):
                # half of the term and of its conjugate: the amplitudes of real modes stay those of a real flow
                for factor, speed in ((c / 2, s), (np.conj(c) / 2, np.conj(s))):
                    out += (factor * np.exp(speed * x))[:, None] * self.source[:, row] / (speed - self.rate)
        return out

    def profile(self, piece: int, offset: np.ndarray) -> np.ndarray:
        """(k, n + 1) velocities at the points ``r`` (the first is the outer end)."""
        x = np.atleast_1d(np.asarray(offset, dtype=float))
        inner = (self._amplitudes(piece, x, self.starts[piece]) @ self.modes.T).real
        low, high = (self.inputs.row(row).at(np.full(len(x), piece), x) for row in (0, 1))
        return np.column_stack([high, inner, high if self.pipe else low])

    def stress(self, piece: int, offset: np.ndarray) -> np.ndarray:
        """(k, 2) traction on the lower/inner and upper/outer wall."""
        slope = self.profile(piece, offset) @ self.first[[-1, 0]].T
        lever = (self.problem.inner, self.problem.outer) if self.problem.rotating else (1.0, 1.0)
        out = self.problem.viscosity * slope * (lever[0], -lever[1])
        if self.pipe:
            out[:, 0] = 0.0
        return out

    def velocity(self, piece: int, offset: float, r: np.ndarray) -> np.ndarray:
        """Velocities at coordinates ``r``."""
        return BarycentricInterpolator(self.r, self.profile(piece, np.array([offset]))[0])(r)

    def mean(self, piece: int, offset: np.ndarray) -> np.ndarray:
        """(k,) mean velocity: over the section; in a rotating gap of the tangential speed over the radius."""
        x, weight = np.polynomial.legendre.leggauss(40)
        inner, outer = self.problem.inner, self.problem.outer
        r = inner + (outer - inner) * (x + 1.0) / 2.0
        measure = weight * r ** min(self.problem.metric, 1)
        total = weight.sum() if self.problem.rotating else measure.sum()
        profiles = self.profile(piece, offset)
        return np.array([measure @ BarycentricInterpolator(self.r, row)(r) for row in profiles]) / total
