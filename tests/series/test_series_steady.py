"""Closed-form steady states against handbook values."""

from __future__ import annotations

import numpy as np
import pytest
from problems import problem

from transient.series.gapshape import FREE, GapShape, SeriesError
from transient.series.regime import steady
from transient.series.steady import log_rest, steady_flow

# White, Fluid Mechanics, Table 6.3: Darcy friction factor times Reynolds number on the hydraulic diameter
WHITE = {
    1e-5: 70.09, 1e-4: 71.78, 1e-3: 74.68, 0.01: 80.11, 0.05: 86.27, 0.1: 89.37, 0.2: 92.35, 0.4: 94.71, 0.6: 95.59,
    0.8: 95.92, 0.99999: 96.0,
}  # fmt: skip


@pytest.mark.parametrize(("ratio", "printed"), WHITE.items())
def test_annulus_friction(ratio: float, printed: float) -> None:
    inner = ratio / (1 - ratio)
    state = steady(problem("annulus_axial", inner=inner, outer=inner + 1), np.array([0.0, 0.0, 1.0]))
    # f Re = 2 G D_h^2 / (mu V) with D_h = 2 gap
    assert 8.0 / state.mean == pytest.approx(printed, abs=0.0051)
    # the walls together carry the pressure: half a wetted-perimeter mean of G D_h / 4
    assert (state.stress * [inner, inner + 1]).sum() == pytest.approx(inner + 0.5, rel=1e-11)


def test_pipe_and_plates_friction() -> None:
    # White, Table 6.3: 64 and 96
    pipe = steady(problem("pipe"), np.array([0.0, 0.0, 1.0]))
    assert 2 * 2.0**2 / pipe.mean == pytest.approx(64.0, rel=1e-14)
    plates = steady(problem("plates"), np.array([0.0, 0.0, 1.0]))
    assert 8 / plates.mean == pytest.approx(96.0, rel=1e-14)


@pytest.mark.parametrize("number", [-3.0, -1.0, 0.0, 2.0])
def test_couette_poiseuille(number: float) -> None:
    # P = h^2 G / (2 mu U): fixed wall (1 + P), moving wall (1 - P), flow 1/2 + P/6 (exact algebra)
    state = steady(problem("plates"), np.array([0.0, 1.0, 2 * number]))
    np.testing.assert_allclose(state.stress, [1 + number, -(1 - number)], atol=1e-14)
    assert state.mean == pytest.approx(0.5 + number / 6, abs=1e-14)


@pytest.mark.parametrize("inner", [0.0101, 0.5, 9999.0])
def test_rotating_annulus_torque(inner: float) -> None:
    # torque per length 4 pi mu R1^2 R2^2 dOmega / (R2^2 - R1^2) (concentric cylinders, from memory)
    outer = inner + 1
    state = steady(problem("annulus_rotating", inner=inner, outer=outer, viscosity=0.3), np.array([2.0, 5.0, 0.0]))
    torque = 4 * np.pi * 0.3 * (inner * outer) ** 2 * 3.0 / (outer**2 - inner**2)
    np.testing.assert_allclose(state.stress * 2 * np.pi * np.array([inner, outer]) ** 2, [torque, -torque], rtol=1e-11)


@pytest.mark.parametrize("a", [3.9, 4.1, 40.0])
def test_mean_of_the_steady_profiles(a: float) -> None:
    x, weight = np.polynomial.legendre.leggauss(40)
    y, weight = 0.5 * (x + 1), 0.5 * weight
    for metric in (1, 3):
        flow = steady_flow(GapShape(metric, a, 0.1, 0.3))
        measure = weight * (a + y) if metric == 3 else weight * (a + y) / (a + 0.5)
        np.testing.assert_allclose(flow.mean(), flow.velocity(y) @ measure, rtol=2e-14, atol=1e-15)


def test_slip_lets_the_wall_run_ahead() -> None:
    # plane Couette flow with slip lengths l1, l2: gradient U / (h + l1 + l2)
    flow = steady_flow(GapShape(0, 0.0, 0.5, 1.5))
    np.testing.assert_allclose(flow.velocity(np.array([0.0, 1.0]))[1], [0.5 / 3, 1.5 / 3], rtol=1e-15)


def test_thin_annulus_tends_to_plates() -> None:
    plates = steady_flow(GapShape(0, 0.0, 0.2, 0.1))
    for a, off in ((1e3, 1e-3), (1e6, 1e-6)):
        thin = steady_flow(GapShape(1, a, 0.2, 0.1))
        np.testing.assert_allclose(thin.mean(), plates.mean(), rtol=off)
        np.testing.assert_allclose(thin.stress(), plates.stress(), rtol=off)


def test_nothing_to_hold_the_fluid_has_no_steady_state() -> None:
    with pytest.raises(SeriesError, match="no wall holds the fluid back"):
        steady_flow(GapShape(0, 0.0, FREE, FREE))


def test_logarithm_less_its_first_terms() -> None:
    x = np.array([1e-8, 1e-3, 0.2499, 0.2501, 3.0])
    import mpmath as mp

    with mp.workdps(40):
        exact = [float(mp.log1p(mp.mpf(v)) - mp.mpf(v) + mp.mpf(v) ** 2 / 2) for v in x]
    np.testing.assert_allclose(log_rest(x), exact, rtol=3e-15)
