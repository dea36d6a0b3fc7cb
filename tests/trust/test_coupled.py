"""Bodies and prescribed flow judged by the exact solution: errors hold, requests are met, and faults show."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from carried import carried
from problems import problem, ramp, sine, step, trapezoid

from transient.answer import look, solve
from transient.gap.problem import Problem
from transient.march import march as room
from transient.march.levels import climb
from transient.result.driven import body_speed
from transient.series.solution import solve as exact_flow
from transient.trust.exact import compare

PUSHED = trapezoid.build(1.0, 0.1, 1.0, 0.1)

CASES: dict[str, Problem] = {
    "pushed": carried(upper={"mass": 1.0, "load": PUSHED}),
    "spring": carried(upper={"mass": 1.0, "load": ramp.build(1.0, 0.5), "stiffness": 20.0}, duration=3.0),
    "thrown": carried(upper={"mass": 0.5, "initial_speed": 0.5}, duration=2.0),
    "massless": carried(upper={"mass": 0.0, "load": ramp.build(1.0, 0.5)}, duration=1.0),
    "sealed, sudden": problem(upper=step.build(1.0), flow=problem().gradient, duration=1.0),
    "pulsating flow": problem(flow=sine.build(1.0, period=0.5), duration=2.0),
    "shaken": carried(upper={"mass": 1.0, "load": sine.build(1.0, period=0.5)}, duration=2.0),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_requests_are_met_and_judged_exactly(name):
    attempt = solve(CASES[name])
    assert attempt.run.errors.kind == "exact"
    assert not [d for d in attempt.wanted if d.ratio > 1.0 and not d.grazes]


@pytest.mark.parametrize("name", ["pushed", "spring", "thrown", "massless"])
def test_errors_of_the_motion_hold_between_the_rows_too(name):
    case = CASES[name]
    ahead = look(case)
    ladder = climb(case, ahead, case.accuracy, 1.0, 2)
    errors, flow = compare(case, ahead, ladder), ladder.best.flow
    exact = exact_flow(case, ahead.until)
    inside = np.flatnonzero(flow.step > 0.0)
    allowed = np.maximum(errors.more["speed"][inside, 1], errors.more["speed"][inside + 1, 1])
    curve = body_speed(flow, 1)
    for share in (0.1, 0.25, 0.4, 0.5, 0.6, 0.8):
        part = np.full(len(inside), share)
        true = exact.motion(flow.piece[inside], flow.offset[inside] + curve.passed(inside, part))[0][:, 1]
        assert (np.abs(curve.at(inside, part) - true) <= allowed).all(), share
    assert errors.more["speed"][:, 1].max() < 0.02 * np.abs(flow.speed[:, 1]).max()


def test_a_wrong_mass_in_the_march_is_seen(monkeypatch):
    """Planted: the march gives the body half a percent more mass than the case."""
    case = CASES["pushed"]
    ahead = look(case)
    true_links = room.links

    def heavier(problem, system):
        wall = problem.walls[1]
        more = replace(wall, body=replace(wall.body, mass=1.005 * wall.body.mass))
        return true_links(replace(problem, walls=(problem.walls[0], more)), system)

    monkeypatch.setattr(room, "links", heavier)
    ladder = climb(case, ahead, case.accuracy, 1.0, 2)
    errors = compare(case, ahead, ladder)
    assert errors.more["speed"][:, 1].max() > 1e-3 * np.abs(ladder.best.flow.speed[:, 1]).max()


def test_a_steady_start_is_not_sudden():
    load = ramp.build(1.0, 0.5, from_=2.0)
    case = carried(upper={"mass": 1.0, "load": load}, start="steady", duration=1.0)
    run = solve(case).run
    assert not run.unbounded.any()
    assert np.isfinite(run.history.stress).all()
    # equilibrium of a block on a film: load h / (mu A) (common practice, no source); A = h = mu = 1 here
    assert run.history.speed[0, 1] == pytest.approx(2.0, rel=1e-12)


def test_the_far_wall_of_a_sealed_gap_feels_a_sudden_start_at_once():
    # the limit mu U / h, half-space against half-space (own derivation); finite elements agree, tests/series
    run = solve(CASES["sealed, sudden"]).run
    assert run.history.stress[0, 0] == pytest.approx(-1.0, rel=1e-12)
    assert run.unbounded[0] == 0.0
    assert run.unbounded[1] > 0.0


def test_a_massless_plate_under_a_sudden_load_has_no_peak_acceleration():
    case = carried(upper={"mass": 0.0, "load": step.build(1.0)}, duration=1.0)
    attempt = solve(case)
    assert attempt.parts["bodies"]["upper"]["peak_acceleration"] is None
