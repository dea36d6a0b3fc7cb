"""Momentum and energy close, and stresses agree with profiles, better by a factor of four per doubling (order 2)."""

from __future__ import annotations

import numpy as np
import pytest
from by_hand import even_steps, marched
from problems import SHAPES, problem, smooth_ramp

from transient.trust.balance import energy_balance, flow_difference, momentum_balance, stress_difference

UNTIL = 1.5


def residuals(shape, balance):
    """Residuals of three levels of one march, each with twice the cells and steps of the one before."""
    case = problem(shape, upper=smooth_ramp.build(1.0, 1.0), duration=UNTIL)
    starts = case.inputs(UNTIL).starts
    return [
        balance(case, marched(case, UNTIL, even_steps(starts, UNTIL, 20 * 2**k), cells=16 * 2**k)).residual
        for k in range(3)
    ]


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("balance", [momentum_balance, energy_balance, stress_difference, flow_difference])
def test_residuals_fall_with_order_two(shape, balance):
    found = residuals(shape, balance)
    order = np.log2(found[-2] / found[-1])
    assert order > 1.8
    assert found[-1] < 2e-3


def test_a_constant_fault_does_not_fall():
    """Negative control: a stress that is off by a thousandth leaves a residual that no refinement removes."""

    def faulty(case, history):
        history.stress[:, 1] *= 1.01
        history.stress_rate[:, 1] *= 1.01
        return momentum_balance(case, history)

    found = residuals("plates", faulty)
    assert np.log2(found[-2] / found[-1]) < 0.5
    assert found[-1] > 1e-3
