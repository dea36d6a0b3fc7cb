"""Flow between ends that hold nothing back (shear-free, or an axis): all of it moves as one, driven by the pressure."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import PRESSURE, Inputs, Problem
from transient.series.gapshape import SeriesError
from transient.series.located import Located
from transient.series.recursion import divided_exponential

# Round-off of the sums over pieces, relative to their terms.
_TRUST = 1e-14


@dataclass(frozen=True, eq=False)
class UniformFlow(Located):
    """density dw/dt = G(t): the same questions as a ``Solution`` answers, from rest."""

    problem: Problem
    pressure: Inputs
    starts: np.ndarray
    gained: np.ndarray
    reach: np.ndarray

    @classmethod
    def of(cls, problem: Problem, inputs: Inputs) -> UniformFlow:
        """Sum the momentum over the pieces.  Raises SeriesError for a start from a steady flow that does not exist."""
        if inputs.before[PRESSURE] != 0.0:
            raise SeriesError("no wall holds the fluid back, so there is no steady flow to start from")
        pieces = np.arange(len(inputs.starts) - 1)
        steps, sizes = _impulse(inputs, pieces, np.diff(inputs.starts))
        gained, reach = (np.concatenate([[0.0], np.cumsum(part)]) for part in (steps, sizes))
        return cls(problem, inputs, inputs.starts, gained, reach)

    def stress(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 2) zeros, exactly."""
        zero = np.zeros((len(np.atleast_1d(piece)), 2))
        return zero, zero.copy()

    def stress_and_mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, 3) stresses and mean velocity in one go, and their bounds (n, 3)."""
        stress, none = self.stress(piece, offset)
        mean, bound = self.mean(piece, offset)
        return np.column_stack([stress, mean]), np.column_stack([none, bound])

    def stress_rate(self, piece: np.ndarray, offset: np.ndarray) -> np.ndarray:
        """(n, 2) zeros."""
        return self.stress(piece, offset)[0]

    def mean(self, piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) velocity, m/s, and its bound (a rotating gap without walls that hold stays at rest)."""
        p, x = np.atleast_1d(piece), np.atleast_1d(np.asarray(offset, dtype=float))
        step, size = _impulse(self.pressure, p, x)
        scale = 0.0 if self.problem.rotating else 1.0 / self.problem.density
        return (self.gained[p] + step) * scale, _TRUST * (self.reach[p] + size) * scale

    def velocity(self, piece: np.ndarray, offset: np.ndarray, r: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n, k) velocity, the same at every coordinate ``r`` (k,), and its bound (n,)."""
        value, bound = self.mean(piece, offset)
        return np.repeat(value[:, None], len(np.atleast_1d(r)), axis=1), bound


def _impulse(inputs: Inputs, piece: np.ndarray, x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Integral of G over the first ``x`` of each piece, and the size of its terms, (n,)."""
    terms = inputs.poly[piece, PRESSURE] * x[:, None] ** np.arange(1, 5) / np.arange(1, 5)
    waves = inputs.coeff[piece, PRESSURE].copy()
    for n, k in np.ndindex(waves.shape):
        if waves[n, k] != 0:
            waves[n, k] *= x[n] * divided_exponential(complex(inputs.rate[piece[n], PRESSURE, k] * x[n]))
    return terms.sum(axis=1) + waves.real.sum(axis=1), np.abs(terms).sum(axis=1) + np.abs(waves).sum(axis=1)
