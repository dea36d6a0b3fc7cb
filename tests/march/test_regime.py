"""What a run is expected to end in, how long it lasts of its own accord, and the way into a periodic state."""

from __future__ import annotations

import numpy as np
import pytest
from problems import SHAPES, constant, lag, problem, ramp, sine, step, trapezoid
from scipy.special import jn_zeros

from transient.answer import solve
from transient.drive import repeat
from transient.gap.system import assemble
from transient.march.plan import features, resolve
from transient.march.regime import outlook, slowest_decay
from transient.result.history import largest


def test_slowest_decay_of_plates_and_pipe():
    """pi^2 nu/h^2 and j01^2 nu/R^2 to a percent (zeros of J0: Abramowitz & Stegun 1964, Table 9.5)."""
    assert slowest_decay(problem()) == pytest.approx(1.0 / np.pi**2, rel=0.01)
    assert slowest_decay(problem("pipe")) == pytest.approx(1.0 / 2.4048255577**2, rel=0.01)


def discrete_rates(system):
    """Rising decay rates of the discrete gap: eigenvalues of storage^-1/2 A storage^-1/2, dense."""
    below = np.append(system.end_conductance[0], system.conductance)
    above = np.append(system.conductance, system.end_conductance[1])
    matrix = np.diag(below + above) - np.diag(system.conductance, 1) - np.diag(system.conductance, -1)
    root = np.sqrt(system.storage)
    return np.linalg.eigvalsh(matrix / np.outer(root, root))


@pytest.mark.parametrize("shape", ["plates", "pipe"])
def test_discrete_decay_rates_tend_to_the_eigenvalues(shape):
    exact = (np.pi * np.arange(1, 4)) ** 2 if shape == "plates" else jn_zeros(0, 3) ** 2
    errors = [np.abs(discrete_rates(assemble(problem(shape), n, (1.0, 1.0)))[:3] / exact - 1.0).max() for n in (32, 64)]
    assert np.log2(errors[0] / errors[1]) == pytest.approx(2.0, abs=0.1)


@pytest.mark.parametrize("shape", SHAPES)
def test_a_run_of_its_own_accord_lasts_until_everything_has_settled_and_a_margin(shape):
    for drive in (constant(1.0), ramp.build(1.0, 3.0), lag.build(1.0, 0.7), step.build(1.0, at=20.0)):
        solved = solve(problem(shape, upper=drive, settle_within=1e-3, accuracy=1e-2))
        said = solved.parts["settling"]
        assert said["reached"]
        assert said["levels"]["0.1 %"]["flow"] is not None
        assert said["time"] < solved.ahead.until < 3.0 * said["time"] + 1.0


def test_a_periodic_run_ends_after_whole_periods_and_shows_at_least_three():
    ahead = outlook(problem(upper=sine.build(1.0, period=0.7)))
    assert ahead.kind == "periodic"
    periods = ahead.until / 0.7
    assert periods == pytest.approx(round(periods), abs=1e-9)
    assert periods >= 3


def test_two_periods_have_their_least_common_multiple():
    ahead = outlook(problem(upper=sine.build(1.0, period=0.2), push=sine.build(1.0, period=0.3)))
    assert ahead.period == pytest.approx(0.6, rel=1e-9)


def test_periods_without_a_common_one_need_a_duration():
    drives = {"upper": sine.build(1.0, period=1.0), "push": sine.build(1.0, period=np.sqrt(2.0))}
    with pytest.raises(ValueError, match="a duration is needed"):
        outlook(problem(**drives))
    assert outlook(problem(**drives, duration=3.0)).kind == "none"


def test_the_start_from_rest_of_a_repeated_pulse_decays_into_the_periodic_state():
    """The flow less its deviation repeats itself from period to period, to the accuracy."""
    pulse = trapezoid.build(1.0, 0.05, 0.1, 0.05)
    solved = solve(problem(upper=repeat.build(pulse, 0.5), accuracy=1e-3), "refinement")
    h, away = solved.run.history, solved.run.regime.deviation
    assert solved.run.regime.kind == "periodic"
    t = np.linspace(0.0, 0.5, 41)[1:-1]
    rest = [h.mean_curve().sample(t + k * 0.5) - away.mean_curve().sample(t + k * 0.5) for k in (0, 1, 2)]
    for later in rest[1:]:
        np.testing.assert_allclose(later, rest[0], atol=2e-3 * np.abs(h.mean).max())


def test_the_deviation_from_a_steady_end_is_the_flow_less_that_end():
    solved = solve(problem("annulus_axial", upper=ramp.build(1.0, 0.1), push=2.0))
    h, away = solved.run.history, solved.run.regime.deviation
    for name in ("stress", "mean", "profile"):
        shift = getattr(h, name) - getattr(away, name)
        np.testing.assert_allclose(shift, np.broadcast_to(shift[-1], shift.shape), atol=1e-10)
    assert np.abs(away.profile[-1]).max() < 1e-4


def test_the_largest_velocity_is_found_between_nodes():
    """sin(pi x) on nodes that miss its top by a quarter of a cell; a plain maximum would err by 2e-3."""
    x = np.linspace(0.0, 1.0, 26) ** 1.02
    profile = np.stack([np.sin(np.pi * x), -0.5 * np.sin(np.pi * x)])
    rate = 2.0 * profile
    value, change = largest(x, profile, rate)
    np.testing.assert_allclose(value, [1.0, 0.5], rtol=1e-5)
    np.testing.assert_allclose(change, [2.0, 1.0], rtol=1e-3)
    assert np.abs(profile).max() < 1.0 - 1e-4


def test_features_of_a_kink_and_a_jump():
    case = problem(upper=ramp.build(1.0, 0.25, at=1.0), lower=step.build(3.0, at=1.0), push=step.build(2.0, at=1.0))
    inputs = case.inputs(2.0)
    found = features(case, inputs, 2.0)
    at = int(np.flatnonzero(inputs.starts == 1.0)[0])
    np.testing.assert_allclose(found.jump[at], [3.0, 0.0], atol=1e-12)
    np.testing.assert_allclose(found.kink[at], [2.0, 6.0], rtol=1e-12)  # acceleration against the fluid's own 2/density


def test_finer_requests_give_finer_grids_and_first_steps():
    case = problem(upper=ramp.build(1.0, 0.1))
    inputs = case.inputs(1.0)
    found = features(case, inputs, 1.0)
    coarse, fine = (resolve(case, inputs, found, accuracy, 0.1, 1e-4) for accuracy in (1e-2, 1e-4))
    assert fine.cells > coarse.cells
    assert fine.tolerance < coarse.tolerance
    assert (fine.first_step < coarse.first_step).all()
