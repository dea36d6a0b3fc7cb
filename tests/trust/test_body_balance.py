"""Momentum and energy of bodies close, to an error that falls with order 2 or more, and planted errors are seen."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from by_hand import even_steps, told, traced
from carried import carried
from problems import ramp, sine, smooth_ramp, trapezoid

from transient.answer import look
from transient.march.facts import body_facts, run_of
from transient.march.levels import Histories, Ladder, climb
from transient.result.run import Run
from transient.trust import body_balance as bodies
from transient.trust.balance import BALANCES
from transient.trust.refine import estimate

PUSHED = trapezoid.build(1.0, 0.1, 1.0, 0.1)
CURVE = ((0.0, 0.3, 0.8), (1.0, 1.4, 0.2))
PLUNGER = {"length": 2.0, "section": 1.0}

CASES = {
    "pushed": carried(upper={"mass": 1.0, "load": PUSHED}),
    "curve and damper": carried(upper={"mass": 1.0, "curve": CURVE, "damping": 0.5}, duration=2.0),
    "spring": carried(upper={"mass": 1.0, "load": ramp.build(1.0, 0.5), "stiffness": 20.0}, duration=3.0),
    "two bodies": carried(
        upper={"mass": 1.0, "load": sine.build(1.0, period=1.0), "stiffness": 5.0},
        lower={"mass": 3.0, "load": PUSHED}, duration=2.0,
    ),
    "thrown": carried(upper={"mass": 1.0, "initial_speed": 0.5}, duration=2.0),
    "slipping": carried(upper={"mass": 1.0, "load": PUSHED}, slips=(0.0, 0.2), duration=2.0),
    "rotor": carried("annulus_rotating", lower={"mass": 1.0, "load": PUSHED}, duration=2.0),
    "plunger": carried(upper={"mass": 1.0, "load": smooth_ramp.build(9.0, 0.5), "displaced": 0.3}, flow=0.0, **PLUNGER),
    "friction": carried(upper={"mass": 1.0, "load": PUSHED, "sliding": 0.2, "breakaway": 0.3}, duration=3.0),
    "massless": carried(upper={"mass": 0.0, "load": ramp.build(1.0, 0.5)}, duration=1.0),
}  # fmt: skip


CLOSURES = (bodies.momentum_closure, bodies.energy_closure)


def solved(case, refine: float = 1.0) -> Run:
    ahead = look(case)
    ladder = climb(case, ahead, case.accuracy, refine, 3)
    return run_of(case, ahead, ladder, estimate(ladder))


@pytest.mark.parametrize("name", CASES)
def test_all_balances_close(name):
    case = CASES[name]
    run = solved(case)
    checks = [*bodies.body_checks(case, run), *(check(case, run.history) for check in BALANCES)]
    assert len(checks) == 4 + 2 * len(run.bodies)
    for found in checks:
        assert found.status == "pass", found


SMOOTH = {
    "pushed": carried(upper={"mass": 1.0, "load": sine.build(1.0, period=1.0)}),
    "sprung and damped": carried(
        upper={"mass": 1.0, "load": sine.build(1.0, period=1.0), "stiffness": 20.0, "damping": 0.5}
    ),
    "plunger": carried(
        upper={"mass": 1.0, "load": sine.build(9.0, period=1.0), "displaced": 0.3}, flow=0.0, **PLUNGER
    ),
    "rotor": carried("annulus_rotating", lower={"mass": 1.0, "load": sine.build(1.0, period=1.0)}),
}


@pytest.mark.parametrize("name", SMOOTH)
def test_what_is_left_falls_with_order_two(name):
    """One level each, steps of the same length, halved with the cells."""
    case = SMOOTH[name]
    left = []
    for each in (100, 200, 400):
        inputs = case.inputs(1.0)
        trace = traced(case, 1.0, cells=each // 2, layers=(0.5, 0.5), plan=even_steps(inputs.starts, 1.0, each))
        flow = told(case, 1.0, trace)
        alone = Histories(flow, None, None, None, 0.0, np.zeros(2))
        ladder = Ladder(alone, alone, inputs, np.zeros(2), (0.5, 0.5), each // 2, each, 0)
        found = [body_facts(case, ladder, end) for end, wall in enumerate(case.walls) if wall.body is not None]
        left.append([closure(case, flow, found[0]).residual for closure in CLOSURES])
    orders = np.log2(np.array(left[:-1]) / np.array(left[1:]))
    assert np.all(orders > 1.8), (orders, left)


@pytest.mark.parametrize("planted", ["stress", "load", "acceleration-free speed"])
def test_planted_errors_are_seen(planted):
    case = CASES["pushed"]
    run = solved(case)
    history, (body,) = run.history, run.bodies
    if planted == "stress":
        history = replace(history, stress=1.02 * history.stress, stress_rate=1.02 * history.stress_rate)
    elif planted == "load":
        body = replace(body, load=body.load + 0.02)
    else:
        history = replace(history, speed=1.02 * history.speed)
    found = bodies.body_checks(case, replace(run, history=history, bodies=(body,)))
    assert [check.status for check in found] == ["fail", "fail"]


def test_the_account_of_a_block_brought_to_its_terminal_speed():
    """F = mu A U/h = 1; the drive's work is what the block keeps, m U^2/2, what the film keeps, rho A h U^2/6, and the
    heat (the kinetic energy of a linear profile)."""
    case = carried(upper={"mass": 2.0, "load": ramp.build(1.0, 0.5)}, accuracy=1e-4)
    said = bodies.accounts(case, solved(case))
    own, film = said["bodies"]["upper"], said["film"]
    assert own["kinetic_gain"] == pytest.approx(1.0, rel=2e-4)
    assert film["kinetic_gain"] == pytest.approx(1.0 / 6.0, rel=2e-4)
    spent = own["kinetic_gain"] + film["kinetic_gain"] + film["dissipated"]
    assert own["drive_work"] == pytest.approx(spent, rel=1e-4)
    assert own["given_to_film"] == pytest.approx(film["work"], rel=1e-6)
    assert own["spring_gain"] == own["damping_loss"] == own["friction_loss"] == 0.0


def test_friction_and_damper_take_their_share():
    given = {"mass": 1.0, "load": PUSHED, "sliding": 0.2, "breakaway": 0.3, "damping": 0.7}
    case = carried(upper=given, duration=4.0)
    run = solved(case)
    own = bodies.accounts(case, run)["bodies"]["upper"]
    travel = run.history.place[-1, 1]
    assert own["friction_loss"] == pytest.approx(0.2 * travel, rel=1e-3)  # one way only
    speed = run.history.speed_curve(1).sample(even := np.linspace(0.0, 4.0, 20001))
    assert own["damping_loss"] == pytest.approx(0.7 * np.trapezoid(speed**2, even), rel=1e-3)
    spent = own["friction_loss"] + own["damping_loss"] + own["given_to_film"]
    assert own["drive_work"] == pytest.approx(spent, rel=1e-3)


def test_nothing_to_account_for_without_bodies():
    case = carried(upper=ramp.build(1.0, 0.5))
    assert bodies.accounts(case, solved(case)) is None
