"""The answer to a unit jump of one input as the textbooks give it, and to any motion by superposition.

Outputs, in this order: stress on the lower and on the upper wall (Pa, traction of the fluid on the wall), mean velocity
(m/s), velocity at the places asked for (m/s; rotating gaps rad/s).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.trust.verification.motion import Motion

WALLS = 3  # outputs before the velocities
FADED = 24.0  # decay exponent of the last mode from which on leaving out the further ones is no error
AT_ONCE = 1e-9  # share of that wait which is round-off of a break's time


@dataclass(frozen=True)
class StartUp:
    """``steady`` (Q,) - sum of ``fading`` (N, Q) exp(-``decay`` (N,) t) after a unit jump; ``beyond`` (Q,):
    what the modes left out give per rate of change of the input."""

    source: str
    decay: np.ndarray
    steady: np.ndarray
    fading: np.ndarray
    beyond: np.ndarray

    def answer(self, motion: Motion, t: np.ndarray) -> np.ndarray:
        """(n, Q) outputs at times ``t`` (n,)."""
        kept = motion.faded(t, self.decay) @ self.fading
        return motion.value(t)[:, None] * self.steady - kept - motion.rate(t)[:, None] * self.beyond

    @property
    def wait(self) -> float:
        """Time after a break at which the modes left out have died away, s."""
        return FADED / float(self.decay[-1])

    def old_enough(self, motion: Motion, t: np.ndarray) -> np.ndarray:
        """(n,) where that much time has passed since every break before ``t``."""
        age = t[:, None] - motion.breaks()
        return ~((age > AT_ONCE * self.wait) & (age < self.wait)).any(axis=1)


def startup(
    source: str, root: np.ndarray, diffusivity: float, gap: float, steady: np.ndarray, fading: np.ndarray
) -> StartUp:
    """A series over the roots (N,), in 1/m; roots follow each other at pi / gap in the end.

    A stress has coefficients that tend to a constant, on the wall across to one of alternating sign: those left out
    answer a slow change with sum(coefficient / decay), here by the midpoint rule and by half the next term.
    Everything else converges by itself.
    """
    decay = diffusivity * root**2
    even, odd = 0.5 * (fading[-1] + fading[-2]), 0.5 * (fading[-1] - fading[-2])
    next_root = root[-1] + 0.5 * np.pi / gap
    beyond = np.zeros(len(steady))
    beyond[:2] = (even * gap / np.pi - 0.5 * odd / next_root)[:2] / (diffusivity * next_root)
    return StartUp(source, decay, steady, fading, beyond)
