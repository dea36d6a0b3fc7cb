"""Answers at early times, tabulated: a gap's response to unit pulses and jumps over one octave of age."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.series.transfer import NODE, WEIGHT

# Chebyshev polynomials over an octave and what a pulse reaches beyond it, ages 1 to 2.3 of the smallest: the nearest
# singularity, age 0, leaves an error of 4.87^-TERMS.
TERMS = 22
MIDDLE, HALF = 1.65, 0.65
# Orders kept: the pulse, then jumps of the 0th, 1st ... derivative; cubics need 5, slow exponentials all.
CUBIC, ALL = 5, 17

_POINTS = np.cos(np.pi * (np.arange(TERMS) + 0.5) / TERMS)
_AGES = MIDDLE + HALF * _POINTS
_TO_COEFFICIENTS = np.cos(np.outer(np.arange(TERMS), np.pi * (np.arange(TERMS) + 0.5) / TERMS)) * 2.0 / TERMS
_TO_COEFFICIENTS[0] /= 2.0
_TURN = np.exp(np.outer(_AGES, NODE)) * WEIGHT
_SERIES = _TO_COEFFICIENTS @ _TURN  # of a sum over nodes, whose imaginary part is the answer
_REACH = np.abs(np.exp(2.0 * NODE) * WEIGHT) + np.abs(np.exp(NODE) * WEIGHT)


@dataclass(frozen=True, eq=False)
class EarlyTable:
    """``series`` (orders, 3, Q, TERMS) Chebyshev coefficients; ``reach`` (orders, 3, Q) sum of magnitudes."""

    series: np.ndarray
    reach: np.ndarray


def early_table(contour: np.ndarray, age: float, orders: int) -> EarlyTable:
    """Invert the transfer function ``contour`` (NODES, 3, Q), given on the nodes for ages from ``age`` to 2 ``age``."""
    # only orders whose power is in range are asked for at so small an age
    with np.errstate(over="ignore", invalid="ignore"):
        power = (NODE[:, None] / age) ** -np.arange(float(orders)) / age
    power = np.where(np.isfinite(power), power, 0.0)
    parts = np.einsum("ko,kiq->koiq", power, contour).reshape(len(NODE), -1)
    shape = (orders, *contour.shape[1:])
    # Real arithmetic halves the work: only the imaginary part is wanted.
    series = _SERIES.real @ parts.imag + _SERIES.imag @ parts.real
    # Errors of the nodes' terms do not all add up: a third of the sum of magnitudes is ample (computed).
    reach = _REACH @ np.abs(parts) / 3.0
    return EarlyTable(np.moveaxis(series.reshape(TERMS, *shape), 0, -1), reach.reshape(shape))
