"""What a solution promises: limits, superposition, scaling, ends it settles to, plain refusals."""

from __future__ import annotations

import numpy as np
import pytest
from problems import GAPS, SHAPES, constant, lag, problem, ramp, sine, step, trapezoid

from transient.drive import repeat, smooth_ramp, table
from transient.gap.problem import Law, Problem
from transient.series import timeline
from transient.series.gapshape import SeriesError
from transient.series.regime import deviation, periodic, regime, steady
from transient.series.solution import solve

TIMES = np.array([1e-7, 1e-4, 3e-3, 0.011, 0.0213, 0.3, 1.7, 4.0])


def places(case: Problem) -> np.ndarray:
    return case.inner + np.array([0.0, 0.1, 0.6, 1.0]) * case.gap


def test_limits_on_both_sides_of_a_jump() -> None:
    case = problem(upper=step.build(to=1.0, from_=0.2, at=0.1), lower=ramp.build(to=1.0, over=0.1), start="steady")
    flow = solve(case, 1.0)
    before, _ = flow.stress(np.array([0]), np.array([0.1]))
    just_before, _ = flow.stress(np.array([0]), np.array([0.1 - 1e-12]))
    at, _ = flow.stress(np.array([1]), np.array([0.0]))
    np.testing.assert_allclose(before, just_before, rtol=1e-9)
    # the lower wall feels nothing yet, the upper one is torn away: minus infinity, as it is dragged along +x
    assert at[0, 0] == pytest.approx(before[0, 0], rel=1e-13)
    assert at[0, 1] == -np.inf
    velocity = flow.velocity(np.array([0, 1]), np.array([0.1, 0.0]), places(case))[0]
    np.testing.assert_allclose(velocity[1] - velocity[0], [0.0, 0.0, 0.0, 0.8], atol=1e-12)
    assert flow.mean(np.array([1]), np.zeros(1))[0] == pytest.approx(flow.mean(np.array([0]), np.array([0.1]))[0])


@pytest.mark.parametrize("shape", SHAPES)
def test_a_slipping_wall_feels_a_finite_jump(shape: str) -> None:
    # at the instant the fluid has not moved: stress = -mu (U - u) / slip, times the radius of a rotating wall
    flow = solve(problem(shape, upper=step.build(to=2.0), slips=(0.0, 0.1), viscosity=0.4), 1.0)
    lever = GAPS[shape][2] if shape == "annulus_rotating" else 1.0
    stress, _ = flow.stress(np.array([0, 0]), np.array([0.0, 1e-16]))
    np.testing.assert_allclose(stress[:, 1], -0.4 * 2.0 / 0.1 * lever, rtol=3e-7)


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("start", ["rest", "steady"])
@pytest.mark.parametrize(
    "drive",
    [
        sine.build(amplitude=1.0, period=0.2, phase=0.4), sine.build(amplitude=1.0, period=6e-4),
        repeat.build(part=trapezoid.build(to=1.0, rise=0.004, hold=0.003, fall=0.002), every=0.013),
        repeat.build(part=trapezoid.build(to=1.0, rise=0.3, hold=0.2, fall=0.1), every=0.9), step.build(to=1.0),
        lag.build(to=1.0, time_constant=0.05),
    ],
    ids=["sine", "fast sine", "short repeat", "long repeat", "step", "lag"],
)  # fmt: skip
def test_flow_is_its_regime_plus_what_dies_out(shape: str, start: str, drive) -> None:  # type: ignore[no-untyped-def]
    case = problem(shape, upper=drive, push=constant(0.3, 0.1), start=start)
    whole, rest, end = solve(case, 5.0), deviation(case, 5.0), periodic(case, 5.0)
    for ask in ("stress", "mean", "velocity"):
        more = (places(case)[1:3],) if ask == "velocity" else ()
        parts = [getattr(flow, ask)(*flow.locate(TIMES), *more) for flow in (whole, rest, end)]
        gap = np.abs(parts[0][0] - parts[1][0] - parts[2][0])
        allowed = sum(part[1] for part in parts)
        assert (gap <= (allowed[:, None] if ask == "velocity" else allowed) * 1.01).all(), ask
    # far on, the slowest mode alone is left: it decays by its own rate, to all digits, however small it is
    later = np.array([3.0, 4.0])
    if drive.eventual.since < 3.0:
        decay = np.log(np.abs(rest.mean(*rest.locate(later))[0]))
        assert decay[0] - decay[1] == pytest.approx(slowest(case), rel=1e-9)


def slowest(case: Problem) -> float:
    from transient.series.gapshape import shape_of
    from transient.series.modes import roots

    return float(roots(shape_of(case), 3)[0] ** 2)


@pytest.mark.parametrize("shape", SHAPES)
def test_periodic_state_comes_back(shape: str) -> None:
    drive = repeat.build(part=trapezoid.build(to=1.0, rise=0.03, hold=0.02, fall=0.01), every=0.1)
    flow = periodic(problem(shape, upper=drive), 0.35)
    first, again = flow.locate(np.array([0.01, 0.047, 0.0999])), flow.locate(np.array([0.01, 0.047, 0.0999]) + 0.2)
    np.testing.assert_allclose(flow.stress(*first)[0], flow.stress(*again)[0], rtol=1e-11)


def test_steady_start_stays_steady() -> None:
    for shape in SHAPES:
        case = problem(shape, upper=constant(0.7), push=constant(0.2), start="steady")
        flow, state = solve(case, 1.0), steady(case, np.array([0.0, 0.7, 0.2]))
        stress, _ = flow.stress(*flow.locate(TIMES[:-2]))
        np.testing.assert_allclose(stress, np.broadcast_to(state.stress, stress.shape), rtol=1e-13)


def test_same_answer_by_few_modes_and_by_many(monkeypatch: pytest.MonkeyPatch) -> None:
    # the split between modes and early answers is ours to choose: it must not show
    case = problem(
        "annulus_rotating", upper=sine.build(amplitude=1.0, period=0.02, phase=0.7),
        lower=smooth_ramp.build(to=1.0, over=0.004), inner=0.05, outer=1.05,
    )  # fmt: skip
    answers = []
    for window in timeline.WINDOWS:
        monkeypatch.setattr(timeline, "WINDOWS", (window,))
        flow = solve(case, 5.0)
        assert flow.window == window
        answers.append((flow.stress(*flow.locate(TIMES)), flow.stress_rate(*flow.locate(TIMES))))
    (stress, bound), rate = answers[0]
    for (other, off), change in answers[1:]:
        assert (np.abs(other - stress) <= bound + off).all()
        np.testing.assert_allclose(change, rate, rtol=1e-9, atol=1e-9 * np.abs(rate).max())


@pytest.mark.parametrize("shape", SHAPES)
def test_rate_is_the_slope_of_the_stress(shape: str) -> None:
    case = problem(shape, upper=smooth_ramp.build(to=1.0, over=0.05), push=sine.build(amplitude=2.0, period=0.3))
    flow = solve(case, 5.0)
    t = np.array([1e-4, 3e-3, 0.04, 0.0502, 0.3])
    step_ = 1e-3 * np.minimum(t, np.where(t > 0.05, t - 0.05, t))
    slope = (flow.stress(*flow.locate(t + step_))[0] - flow.stress(*flow.locate(t - step_))[0]) / (2 * step_)[:, None]
    np.testing.assert_allclose(flow.stress_rate(*flow.locate(t)), slope, rtol=1e-5, atol=1e-7)


def test_units_only_scale() -> None:
    # 0.8 mm of water against a gap of unit size: U, mu U / h and h^2 / nu carry all of it
    height, mu, rho = 0.8e-3, 1.002e-3, 998.0
    time = height**2 * rho / mu
    plain = solve(problem(upper=ramp.build(to=1.0, over=0.07)), 2.0)
    real = solve(
        problem(upper=ramp.build(to=0.3, over=0.07 * time), outer=height, density=rho, viscosity=mu), 2.0 * time
    )
    one, other = plain.stress(*plain.locate(TIMES[:-2]))[0], real.stress(*real.locate(TIMES[:-2] * time))[0]
    np.testing.assert_allclose(other, one * mu * 0.3 / height, rtol=1e-11, atol=1e-12 * mu * 0.3 / height)


def test_thin_annulus_tends_to_plates() -> None:
    plates = solve(problem(upper=ramp.build(to=1.0, over=0.02)), 2.0)
    t = TIMES[2:-1]
    expected = plates.stress(*plates.locate(t))[0]
    for inner in (1e3, 1e5):
        thin = solve(problem("annulus_axial", upper=ramp.build(to=1.0, over=0.02), inner=inner, outer=inner + 1), 2.0)
        np.testing.assert_allclose(thin.stress(*thin.locate(t))[0], expected, rtol=1 / inner, atol=1 / inner)


def test_a_table_of_many_rows_agrees_with_the_curve_it_samples() -> None:
    # 1 - cos sampled 4,000 times: each row is a kink of curvature / n, which answers with 2 sqrt(t / pi) until the next
    n = 4000
    t = np.linspace(0.0, 1.0, n + 1)
    sampled = solve(problem(upper=table.build(times=t, values=0.5 * (1 - np.cos(2 * np.pi * t)))), 1.0)
    wave = solve(problem(upper=sine.build(amplitude=0.5, period=1.0, phase=-np.pi / 2, mean=0.5)), 1.0)
    when = np.array([0.013, 0.21, 0.5004, 0.93])
    one, other = sampled.stress(*sampled.locate(when))[0], wave.stress(*wave.locate(when))[0]
    np.testing.assert_allclose(one, other, atol=0.5 * (2 * np.pi) ** 2 / n * 2 * np.sqrt(1 / n / np.pi))


def test_late_instants_keep_their_offset() -> None:
    # 1e-12 of a diffusion time after a break at 1e5 of them: lost in a plain sum of times
    late = solve(problem(upper=step.build(to=1.0, at=1e5)), 2e5)
    early = solve(problem(upper=step.build(to=1.0)), 1.0)
    offset = np.array([1e-12])
    np.testing.assert_allclose(
        late.stress(np.array([1]), offset)[0], early.stress(np.array([0]), offset)[0], rtol=1e-13, atol=1e-30
    )


def test_unrestrained_fluid_moves_as_one() -> None:
    free = problem(push=ramp.build(to=2.0, over=1.0), kinds=("shear_free", "shear_free"), density=4.0)
    flow = solve(free, 5.0)
    mean, bound = flow.mean(*flow.locate(np.array([1.0, 3.0])))
    # impulse of the pressure over density: (1, 1 + 2 x 2) / 4
    assert (np.abs(mean - [0.25, 1.25]) <= bound).all()
    assert not flow.stress(*flow.locate(np.array([1.0])))[0].any()
    with pytest.raises(SeriesError, match="no steady state"):
        deviation(free, 5.0)


def test_refusals() -> None:
    with pytest.raises(SeriesError, match="neither a steady nor a periodic"):
        deviation(problem(upper=table.build(times=[0.0, 1.0], values=[0.0, 1.0]), lower=endless()), 1.0)
    shear = problem()
    object.__setattr__(shear, "law", Law(1, (1.0, 0.5)))
    with pytest.raises(SeriesError, match="constant one"):
        solve(shear, 1.0)
    with pytest.raises(SeriesError, match="out of its reach"):
        solve(problem(), 1.0, tolerance=1e-15)


def endless():  # type: ignore[no-untyped-def]
    from transient.drive.pieces import total

    # two waves without a common period
    return total([sine.build(amplitude=1.0, period=1.0), sine.build(amplitude=1.0, period=np.sqrt(2))])


def test_regime_of_a_case() -> None:
    assert regime(problem(lower=endless())) is None
    found = regime(problem(upper=sine.build(amplitude=1.0, period=0.5)))
    assert found is not None
    assert found.period == pytest.approx(0.5)
