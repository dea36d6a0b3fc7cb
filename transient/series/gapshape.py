"""The key of every exact answer: the gap in units of its own width, with what each end does.

Lengths are in gaps, times in diffusion times gap^2 / nu, speeds in their own unit.  All radii are then
``a + y`` with ``0 <= y <= 1``, so that a nearly closed annulus (large ``a``) loses no digits.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Problem

FREE = np.inf  # a slip length without end: no traction at all


class SeriesError(ValueError):
    """The case has no series solution here; the message is one plain sentence."""


@dataclass(frozen=True)
class GapShape:
    """``metric`` m; ``a`` inner radius over gap (0 for plates and pipes); slip lengths of both ends over the gap.

    A slip length of ``FREE`` is a shear-free end; ``axis`` marks a pipe's centre, which is no wall at all.
    """

    metric: int
    a: float
    lower: float
    upper: float
    axis: bool = False

    @property
    def b(self) -> float:
        """Outer radius over gap (1 for plates and pipes)."""
        return self.a + 1.0

    @property
    def order(self) -> float:
        """Bessel order nu of the eigenfunctions r^-nu C_nu(lambda r); -1/2 makes them sines."""
        return (self.metric - 1) / 2

    @property
    def unrestrained(self) -> bool:
        """Whether no end holds the fluid back: it then moves as a whole, without a steady state."""
        return (self.axis or self.lower == FREE) and self.upper == FREE

    @property
    def volume(self) -> float:
        """Integral of r^m over the gap."""
        return 1.0 if self.metric == 0 else self.a + 0.5

    @property
    def levers(self) -> tuple[float, float]:
        """Factors of the wall gradients in the wall stresses: r in a rotating gap, else 1."""
        return (self.a, self.b) if self.metric == 3 else (1.0, 1.0)

    @property
    def grips(self) -> np.ndarray:
        """(2,) 1 where a wall can pull on the fluid, 0 at a shear-free end and at an axis."""
        return np.array([float(self.lower != FREE and not self.axis), float(self.upper != FREE)])


def shape_of(problem: Problem) -> GapShape:
    """The dimensionless gap of a problem.  Raises SeriesError where viscosity is not constant or a wall unknown."""
    if problem.law.code != 0:
        raise SeriesError("the viscosity depends on the shear rate: only a constant one has a series solution")
    gap = problem.gap
    slips = []
    for wall in problem.walls:
        if wall.kind not in ("moving", "shear_free", "axis"):
            raise SeriesError(f"no series solution is known for a {wall.kind.replace('_', ' ')} wall")
        slips.append(FREE if wall.kind == "shear_free" else wall.slip_length / gap)
    axis = problem.walls[0].kind == "axis"
    a = 0.0 if problem.metric == 0 else problem.inner / gap
    return GapShape(problem.metric, a, slips[0], slips[1], axis)
