"""Observed order, extrapolated value and grid convergence index from three solutions of one case.

Celik et al. (2008), J. Fluids Eng. 130, 078001, steps 1 to 5; index 1 is the finest solution.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

SAFETY = 1.25  # factor of safety of the index with three solutions
MOST_ROUNDS = 200
ALIKE = 1e-12


@dataclass(frozen=True)
class Convergence:
    """What three solutions tell: ``order`` p; ``extrapolated`` value; ``approximate_error`` |1 - f2/f1|;
    ``extrapolated_error`` of the finest against the extrapolated value; ``index`` the fine-grid convergence index;
    ``oscillatory``: the two differences have opposite signs.  Errors and index are fractions."""

    order: float
    extrapolated: float
    approximate_error: float
    extrapolated_error: float
    index: float
    oscillatory: bool


def refinement_ratio(fine: float, coarse: float, dimensions: int = 1) -> float:
    """Ratio of representative cell sizes of two grids, from their numbers of cells (step 1)."""
    return (fine / coarse) ** (1.0 / dimensions)


def observed_order(values: tuple[float, float, float], fine_ratio: float, coarse_ratio: float) -> float:
    """Order p (step 3) from ``values`` fine, medium, coarse; ratios of cell sizes medium/fine and coarse/medium.

    Raises ``ValueError`` where two solutions are equal, a ratio is not above 1, or no order fits.
    """
    fine, medium, coarse = values
    near, far = medium - fine, coarse - medium
    if near == 0.0 or far == 0.0:
        raise ValueError("two of the solutions are equal: they tell no order")
    if not (fine_ratio > 1.0 and coarse_ratio > 1.0):
        raise ValueError("each grid must be coarser than the one before: ratios above 1")
    sign = float(np.sign(far / near))
    order = 0.0
    shift = 0.0
    for _ in range(MOST_ROUNDS):
        last, order = order, abs(np.log(abs(far / near)) + shift) / np.log(fine_ratio)
        if abs(order - last) <= ALIKE * max(order, ALIKE):
            return float(order)
        low, high = fine_ratio**order - sign, coarse_ratio**order - sign
        if fine_ratio != coarse_ratio:
            if not (np.isfinite(high) and low > 0.0 and high > 0.0):
                break
            shift = float(np.log(low / high))
    raise ValueError("no order fits the three solutions")


def extrapolated(fine: float, medium: float, ratio: float, order: float) -> float:
    """Value that two solutions of known order point to (step 4)."""
    gain = ratio**order
    return (gain * fine - medium) / (gain - 1.0)


def convergence_index(fine: float, medium: float, ratio: float, order: float) -> float:
    """Grid convergence index of the finer of two solutions, a fraction (step 5; Roache 1994)."""
    return SAFETY * abs((fine - medium) / fine) / (ratio**order - 1.0)


def convergence(values: tuple[float, float, float], fine_ratio: float, coarse_ratio: float) -> Convergence:
    """All of the above from three solutions; arguments and errors as in ``observed_order``."""
    fine, medium, coarse = values
    order = observed_order(values, fine_ratio, coarse_ratio)
    limit = extrapolated(fine, medium, fine_ratio, order)
    return Convergence(
        order,
        limit,
        abs((fine - medium) / fine),
        abs((limit - fine) / limit),
        convergence_index(fine, medium, fine_ratio, order),
        (medium - fine) * (coarse - medium) < 0.0,
    )
