"""Balances on histories from textbook series close; a planted error is caught."""

from __future__ import annotations

from dataclasses import replace

import closed_histories as closed
import numpy as np
import pytest
from scipy.integrate import quad

from transient.trust import balance, nodes

CASES = {
    "plates, ramp": closed.couette_ramp,
    "plates, sudden": closed.couette_sudden,
    "pipe, pressure step": closed.pipe_start,
    "annulus, axial mode": lambda: closed.annulus_mode(1),
    "annulus, rotating mode": lambda: closed.annulus_mode(3),
}
_MADE: dict = {}


def made(name):
    if name not in _MADE:
        _MADE[name] = CASES[name]()
    return _MADE[name]


@pytest.mark.parametrize("name", CASES)
def test_exact_histories_close(name):
    # Exact solutions satisfy every balance: what is left is the quadrature's own error.
    case, history = made(name)
    assert balance.momentum_balance(case, history).residual < 3e-6
    assert balance.energy_balance(case, history).residual < 1e-5
    assert balance.stress_difference(case, history).residual < 1e-5
    assert balance.flow_difference(case, history).residual < 3e-6
    assert all(check(case, history).status == "pass" for check in balance.BALANCES)


@pytest.mark.parametrize("name", CASES)
def test_a_wrong_stress_is_caught_by_all_three(name):
    case, history = made(name)
    wrong = replace(history, stress=1.002 * history.stress, stress_rate=1.002 * history.stress_rate)
    assert balance.momentum_check(case, wrong).status == "fail"
    assert balance.stress_check(case, wrong).status == "fail"
    if "mode" not in name and "pipe" not in name:  # walls at rest do no work, whatever their stress
        assert balance.energy_check(case, wrong).status == "fail"


@pytest.mark.parametrize("name", CASES)
def test_a_wrong_profile_is_caught(name):
    case, history = made(name)
    late = history.profile.copy()
    late[len(late) // 2 :] *= 1.002
    wrong = replace(history, profile=late)
    assert balance.momentum_check(case, wrong).status == "fail"
    assert balance.energy_check(case, wrong).status == "fail"
    assert balance.stress_check(case, wrong).status == "fail"


@pytest.mark.parametrize("name", CASES)
def test_a_wrong_mean_velocity_is_caught(name):
    case, history = made(name)
    assert balance.flow_check(case, replace(history, mean=1.002 * history.mean)).status == "fail"


def test_a_sign_error_of_one_wall_is_caught():
    case, history = made("plates, ramp")
    stress = history.stress * np.array([-1.0, 1.0])
    wrong = replace(history, stress=stress, stress_rate=history.stress_rate * np.array([-1.0, 1.0]))
    assert balance.momentum_balance(case, wrong).residual > 0.1
    assert balance.stress_difference(case, wrong).residual > 0.1


def test_impulse_of_a_sudden_start():
    # Stokes' first problem: integral of mu U/sqrt(pi nu t) is 2 U rho sqrt(nu t/pi).
    case, history = made("plates, sudden")
    parts = balance.increments(history.piece, history.offset, history.stress[:, 1], history.stress_rate[:, 1])
    early = np.flatnonzero(history.time < 0.01 * case.diffusion_time)[-1]
    exact = -2 * 0.3 * case.density * np.sqrt(closed.NU * history.time[early] / np.pi)
    assert balance.running(parts, np.array([early]))[0] == pytest.approx(exact, rel=1e-5)


def test_few_profiles_widen_the_limit_of_the_energy_check_and_say_so():
    case, history = made("plates, ramp")
    few = np.unique(np.append(np.arange(0, len(history.time), 12), len(history.time) - 1))
    sparse = replace(
        history, profile_row=few, profile=history.profile[few], profile_rate=history.profile_rate[few]
    )
    check = balance.energy_check(replace(case, accuracy=1e-9), sparse)
    assert check.limit > 1e-9
    assert "allows to judge" in check.note
    assert balance.momentum_balance(case, sparse).residual < 3e-6


def test_few_nodes_widen_the_limit_of_the_stress_check_and_say_so():
    # cos(10 y) on eleven even nodes: a difference over seven of them cannot be exact, and must know it.
    y = np.linspace(0.0, 1.0, 11)
    case = closed.problem(outer=1.0, accuracy=1e-3)
    time, piece, offset = closed.rows([0.0], 1e6, 1e3)
    profile = np.tile(np.cos(10 * y), (len(time), 1))
    stress = np.tile([0.0, closed.VISCOSITY * 10 * np.sin(10.0)], (len(time), 1))
    nothing = np.zeros_like(time)
    history = closed.made(case, time, piece, offset, stress, 0 * stress, profile, 0 * profile, y, nothing)
    check = balance.stress_check(case, history)
    assert check.value > 1e-3
    assert check.status == "pass"
    assert "allows to judge" in check.note


def test_a_run_too_short_to_judge_says_so():
    case, history = closed.couette_ramp(n=31)
    first = replace(history, profile_row=history.profile_row[:1], profile=history.profile[:1],
                    profile_rate=history.profile_rate[:1], travel=history.travel[:1])  # fmt: skip
    for check in balance.BALANCES:
        assert "too short" in check(case, first).note
        assert check(case, first).as_dict()["limit"] is None


def test_slip_takes_its_share_of_the_work():
    # Steady Couette flow with slip (Navier): stress mu U/(h + b), part b/(h + b) of the work is lost at the wall.
    h, b, speed = 1e-3, 2e-4, 0.3
    case = closed.problem(outer=h, speeds=(0.0, speed), slips=(0.0, b), start="steady")
    time, piece, offset = closed.rows([0.0], 1.0, 1e-3)
    position = h * closed.graded(41)
    profile = np.tile(speed * position / (h + b), (len(time), 1))
    stress = np.tile(closed.VISCOSITY * speed / (h + b) * np.array([1.0, -1.0]), (len(time), 1))
    nothing = np.zeros_like(time)
    history = closed.made(
        case, time, piece, offset, stress, 0 * stress, profile, 0 * profile, position, nothing
    )
    history = replace(history, speed=np.tile([0.0, speed], (len(time), 1)))
    assert balance.energy_balance(case, history).residual < 1e-11
    assert balance.energy_balance(replace(case, walls=(case.walls[0], replace(case.walls[1], slip_length=0.0))),
                                  history).residual == pytest.approx(b / (h + b), rel=1e-9)  # fmt: skip


def test_nothing_moves():
    case = closed.problem()
    time, piece, offset = closed.rows([0.0], 1.0, 1e-3)
    nothing, position = np.zeros((len(time), 2)), 1e-3 * closed.graded(21, 1e-2)
    still = np.zeros((len(time), 21))
    history = closed.made(case, time, piece, offset, nothing, nothing, still, still, position, nothing[:, 0])
    assert [check(case, history).value for check in balance.BALANCES] == [0.0] * 4


@pytest.mark.parametrize("metric", [0, 1, 3])
def test_forms_against_adaptive_quadrature(metric):
    # SciPy's adaptive quadrature of w = exp(3 r), r from 1 to 2.
    errors = []
    for n in (21, 41):
        r = 1.0 + closed.graded(n, 2e-2)
        w = np.exp(3 * (r - 2))[None]
        forms = nodes.forms(r, metric)
        exact = [
            quad(lambda x: x**metric * np.exp(3 * (x - 2)), 1, 2)[0],
            quad(lambda x: x**metric * np.exp(6 * (x - 2)), 1, 2)[0],
            quad(lambda x: x**metric * 9 * np.exp(6 * (x - 2)), 1, 2)[0],
        ]
        found = [
            float((w @ forms.weight)[0]),
            float(nodes.quadratic(forms.mass, w, w)[0]),
            float(nodes.quadratic(forms.stiffness, w, w)[0]),
        ]
        errors.append(np.abs(np.array(found) - exact))
    assert (errors[1] < 2e-5).all()
    assert (errors[0] / errors[1] > 6.0).all()  # at least third order


@pytest.mark.parametrize("metric", [0, 1, 3])
@pytest.mark.parametrize("end", [0, 1])
def test_wall_flux_of_a_known_profile(metric, end):
    r = 1.0 + closed.graded(81, 2e-3)
    found = nodes.wall_flux(r, np.cos(3 * r)[None], metric, end)[0]
    at = r[0] if end == 0 else r[-1]
    assert found == pytest.approx(-3 * np.sin(3 * at) * at**metric, rel=2e-6)


def test_wall_flux_is_exact_for_steady_flow_between_cylinders():
    # w = r^-2 is steady between rotating cylinders: r^3 w' = -2 on any nodes.
    r = np.array([1.0, 1.3, 1.5, 1.9, 2.4, 3.0])
    assert nodes.wall_flux(r, r[None] ** -2.0, 3, 0)[0] == pytest.approx(-2.0, rel=1e-12)
    assert nodes.wall_flux(r, np.log(r)[None], 1, 1)[0] == pytest.approx(1.0, rel=1e-12)
