"""Periodic flows of the textbooks."""

from __future__ import annotations

import numpy as np
import pytest
from problems import problem, sine
from scipy.optimize import brentq

from transient.series.gapshape import GapShape
from transient.series.regime import periodic
from transient.series.transfer import wall_transfer

PIPE = GapShape(1, 0.0, 0.0, 0.0, axis=True)

# Womersley (1955): alpha, M'10 / alpha^2, eps10 in degrees (his formula, evaluated: computed values)
WOMERSLEY = [
    (1.0, 0.1231959, 80.54734), (2.0, 0.1031170, 56.73843), (3.0, 0.0685443, 35.69738), (3.34, 0.0587475, 30.94513),
    (5.0, 0.0302244, 18.64715), (10.0, 0.0086835, 8.69337),
]  # fmt: skip


def swing(values: np.ndarray) -> complex:
    """Complex amplitude (as of sin) of equally spaced samples over one period."""
    n = np.arange(len(values))
    return 2j * np.mean(values * np.exp(-2j * np.pi * n / len(values)))


def over_period(alpha: float, shape: str = "pipe") -> tuple:
    rate = alpha**2
    flow = periodic(problem(shape, push=sine.build(amplitude=1.0, frequency=rate / (2 * np.pi))))
    return flow, flow.locate(np.arange(16) / 16 * 2 * np.pi / rate)


@pytest.mark.parametrize(("alpha", "size", "angle"), WOMERSLEY)
def test_pulsating_pipe_flow(alpha: float, size: float, angle: float) -> None:
    flow, where = over_period(alpha)
    mean = swing(flow.mean(*where)[0])
    # Q / (pi R^4 G / mu) = (M'10 / alpha^2) sin(w t + eps10) for G cos w t: 90 degrees behind for G sin w t
    assert abs(mean) == pytest.approx(size, abs=6e-8)
    assert np.degrees(np.angle(mean)) + 90 == pytest.approx(angle, abs=6e-6)


def test_slow_pulsation_is_quasi_steady() -> None:
    # Womersley (1955): amplitude 1/8, lag alpha^2 / 6
    flow, where = over_period(0.01)
    mean = swing(flow.mean(*where)[0])
    assert abs(mean) == pytest.approx(1 / 8, rel=1e-8)
    assert -np.angle(mean) == pytest.approx(0.01**2 / 6, rel=1e-6)


# plates: W = half-width sqrt(w / nu), flow over quasi-steady flow, its lag in degrees, ratio of wall stresses:
# 3 (1 - tanh z / z) / (i W^2) and tanh z / z with z = sqrt(i) W (evaluated: computed values)
PLATES = [(1, 0.9269845, 21.7598, 0.9307951), (2, 0.5268169, 57.1566, 0.5595604), (5, 0.1044111, 80.6685, 0.1997605)]


@pytest.mark.parametrize(("number", "size", "lag", "stress"), PLATES)
def test_pulsating_flow_between_plates(number: float, size: float, lag: float, stress: float) -> None:
    flow, where = over_period(2.0 * number, "plates")
    mean = 12 * swing(flow.mean(*where)[0])
    assert abs(mean) == pytest.approx(size, abs=6e-8)
    assert -np.degrees(np.angle(mean)) == pytest.approx(lag, abs=6e-5)
    assert 2 * abs(swing(flow.stress(*where)[0][:, 0])) == pytest.approx(stress, abs=6e-8)


def test_annular_effect() -> None:
    # Richardson & Tyler (1929): the largest velocity lies near the wall, at 2.2841 sqrt(2 nu / w), 1.069432 of the
    # inviscid amplitude (thin-layer limit, evaluated: computed values)
    rate = 4e6
    flow, where = over_period(np.sqrt(rate), "plates")
    depth = np.linspace(2.2, 2.4, 201)
    values = flow.velocity(*where, depth * np.sqrt(2 / rate))[0]
    size = rate * np.abs([swing(column) for column in values.T])
    assert depth[size.argmax()] == pytest.approx(2.2841, abs=1e-3)
    assert size.max() == pytest.approx(1.069432, abs=1e-6)


def test_oscillating_wall() -> None:
    # Stokes's second problem: the wall feels sqrt(rho mu w) of its speed, 45 degrees ahead (from memory)
    rate = 1e4
    flow = periodic(problem(upper=sine.build(amplitude=1.0, frequency=rate / (2 * np.pi))))
    where = flow.locate(np.arange(16) / 16 * 2 * np.pi / rate)
    stress = -swing(flow.stress(*where)[0][:, 1])
    assert abs(stress) == pytest.approx(np.sqrt(rate), rel=1e-12)
    assert np.degrees(np.angle(stress)) == pytest.approx(45.0, abs=1e-9)


def test_unsteady_friction_of_a_pipe() -> None:
    # Zielke, J. Basic Eng. 90 (1968) 109: stress = 4 mu V / R + (2 mu / R) V' * W, W = sum exp(-n_i theta); the first
    # exponents as printed, which differ from the exact squares of the zeros of J2 in the fifth or sixth digit
    def weight(s: complex) -> complex:
        lower, stress, mean = wall_transfer(PIPE, np.array([s], complex))[0, 2]
        assert lower == 0
        return (stress / mean - 4) / (2 * s)

    def mean(rate: float) -> float:
        return float(wall_transfer(PIPE, np.array([-rate + 0j]))[0, 2, 2].real)

    for printed in (26.3744, 70.8493, 135.0198, 218.9216, 322.5544):
        exact = brentq(mean, printed - 0.5, printed + 0.5, xtol=1e-12)
        assert exact == pytest.approx(printed, rel=3e-5)
    # his short-time series, transformed term by term (coefficients from memory)
    s = 2e4
    short = sum(
        c * g * s**-p
        for c, g, p in (
            (0.282095, np.sqrt(np.pi), 0.5), (-1.25, 1.0, 1.0), (1.057855, np.sqrt(np.pi) / 2, 1.5), (0.9375, 1.0, 2.0),
            (0.396696, 0.75 * np.sqrt(np.pi), 2.5), (-0.351563, 2.0, 3.0),
        )
    )  # fmt: skip
    assert weight(s).real == pytest.approx(short, rel=1e-6)
