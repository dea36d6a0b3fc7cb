"""Case in, answer out: attempts, exit status, refusals of the march, and what a planted fault does to the verdict."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from problems import constant, problem, ramp, sine, step

from transient import answer
from transient.answer import SolveError, exit_status, run, solve
from transient.case.read import read_case
from transient.drive.pieces import Drive, Eventual, Track
from transient.drive.piecewise import Pieces
from transient.gap.problem import Law
from transient.march import march as room

CASES = Path(__file__).resolve().parents[1] / "cases"


@pytest.fixture(scope="module")
def flow_cell():
    return read_case(CASES / "flow_cell.toml")


def test_a_case_from_file_to_result(flow_cell):
    result = run(flow_cell)
    assert exit_status(result) == 0
    assert result.summary["accuracy"]["met"] is True
    assert result.summary["verdict"] in ("good", "caution")
    assert result.settling.time == result.summary["settling"]["time"]
    assert result.velocity.shape == (len(result.profile_time), len(result.position))
    assert np.isfinite(result.velocity).all()
    assert result.summary["numerics"]["steps"] > 0


def test_solving_twice_gives_the_same_numbers(flow_cell):
    one, two = run(flow_cell), run(flow_cell)
    for name in ("settling", "walls", "flow", "accuracy"):
        assert one.summary[name] == two.summary[name]
    np.testing.assert_array_equal(one.wall_stress, two.wall_stress)


def test_further_attempts_are_made_until_the_request_is_met(monkeypatch):
    seen = []
    true = answer._attempt

    def watched(problem_, ahead, refine, levels, judge):
        seen.append(refine)
        solved = true(problem_, ahead, refine, levels, judge)
        if len(seen) < 3:  # planted: one number misses by a factor of four
            solved = replace(solved, wanted=[replace(solved.wanted[0], error=4.0 * solved.wanted[0].allowed)])
        return solved

    monkeypatch.setattr(answer, "_attempt", watched)
    solve(problem(upper=ramp.build(1.0, 0.1)))
    assert len(seen) == 3
    np.testing.assert_allclose(np.array(seen[1:]) / seen[:-1], np.sqrt(4.0 / answer.AIM))


def test_an_accuracy_out_of_reach_ends_with_what_was_reached_and_status_3(monkeypatch, flow_cell):
    monkeypatch.setattr(answer, "MOST_ATTEMPTS", 1)
    true = answer._attempt

    def short(problem_, *more):
        solved = true(problem_, *more)
        missed = [replace(demand, error=3.0 * demand.allowed) for demand in solved.wanted[:1]]
        return replace(solved, wanted=missed + solved.wanted[1:])

    monkeypatch.setattr(answer, "_attempt", short)
    result = run(flow_cell)
    assert exit_status(result) == 3
    said = result.summary["accuracy"]
    assert said["met"] is False
    assert said["worst"]
    assert said["reached"] == pytest.approx(3.0 * said["asked"], rel=1e-12)
    checks = {check["name"]: check for check in result.summary["checks"]}
    assert checks["accuracy reached"]["status"] == "caution"
    assert "not reached" in checks["accuracy reached"]["note"]


def test_the_best_attempt_is_kept_when_later_ones_are_worse(monkeypatch):
    ratios = iter([5.0, 2.0, 7.0, 9.0, 9.0, 9.0])
    true = answer._attempt

    def rated(*more):
        solved = true(*more)
        first = solved.wanted[0]
        return replace(solved, wanted=[replace(first, error=next(ratios) * first.allowed)])

    monkeypatch.setattr(answer, "_attempt", rated)
    monkeypatch.setattr(answer, "FINEST", 40.0)
    best = solve(problem(upper=ramp.build(1.0, 0.1), accuracy=1e-2))
    assert best.wanted[0].ratio == pytest.approx(2.0)


def test_work_beyond_the_limit_is_not_begun(monkeypatch):
    monkeypatch.setattr(answer, "MOST_WORK", 1.0)
    monkeypatch.setattr(answer, "unmet", lambda wanted: wanted[:1])  # planted: never satisfied
    seen = []
    true = answer._attempt
    monkeypatch.setattr(answer, "_attempt", lambda *more: seen.append(1) or true(*more))
    solve(problem(upper=ramp.build(1.0, 0.1)))
    assert len(seen) == 1


def test_a_march_with_a_wrong_viscosity_is_never_called_good(monkeypatch, flow_cell):
    true = room.assemble
    monkeypatch.setattr(
        room, "assemble", lambda case, *more: true(replace(case, law=Law(0, (1.02 * case.viscosity,))), *more)
    )
    monkeypatch.setattr(answer, "MOST_ATTEMPTS", 1)
    result = run(flow_cell)
    assert exit_status(result) in (1, 3)
    assert result.summary["verdict"] != "good"


@pytest.mark.parametrize("judge", ["series", "refinement"])
def test_errors_say_where_they_come_from(judge):
    parts = solve(problem(upper=ramp.build(1.0, 0.1)), judge).parts
    kind = {"series": "exact", "refinement": "estimate"}[judge]
    assert parts["settling"]["error_kind"] == kind
    assert parts["walls"]["upper"]["error_kind"] == kind
    assert parts["flow"]["error_kind"] == kind


def test_both_judges_agree_within_their_errors():
    flow = problem("annulus_rotating", upper=ramp.build(1.0, 0.1))
    one, two = (solve(flow, judge).parts for judge in ("series", "refinement"))
    for wall in ("inner", "outer"):
        a, b = one["walls"][wall], two["walls"][wall]
        assert abs(a["peak_stress"] - b["peak_stress"]) <= a["peak_stress_error"] + b["peak_stress_error"]
    off = abs(one["settling"]["time"] - two["settling"]["time"])
    assert off <= one["settling"]["error"] + two["settling"]["error"]


def test_a_profile_asked_for_late_lengthens_a_run_of_its_own_accord():
    solved = solve(problem(upper=1.0, profile_times=(0.1, 25.0)))
    assert solved.ahead.until == 25.0
    fixed = solve(problem(upper=1.0, profile_times=(0.1, 25.0), duration=2.0))
    assert fixed.ahead.until == 2.0


def growing(rate: float) -> Drive:
    """exp(rate t) - 1: leaves the range of numbers when the run is long enough."""
    coeff, speed = np.array([[1.0 + 0j]]), np.array([[rate + 0j]])
    pieces = Pieces(np.zeros(1), np.array([[-1.0, 0.0, 0.0, 0.0]]), coeff, speed, 0.0)
    return Drive((Track(pieces),), 0.0, Eventual(None))


@pytest.mark.filterwarnings("ignore::RuntimeWarning")
def test_no_infinity_leaves_the_solver():
    """exp(400 t) overflows at t = 1.775: the march stops with time, place and likely cause, in one line."""
    with pytest.raises(SolveError) as caught:
        solve(problem(upper=growing(400.0), duration=3.0), "refinement")
    text = str(caught.value)
    assert "\n" not in text
    assert "t = 1." in text
    assert "r = " in text
    assert "likely cause" in text


def test_status_1_outranks_status_3(flow_cell):
    result = run(flow_cell)
    for verdict, met, status in (("good", True, 0), ("caution", True, 0), ("good", False, 3), ("failed", False, 1),
                                 ("outside", True, 1)):  # fmt: skip
        summary = result.summary | {"verdict": verdict, "accuracy": result.summary["accuracy"] | {"met": met}}
        assert exit_status(replace(result, summary=summary)) == status


def test_a_periodic_case_is_judged_by_the_series_too():
    solved = solve(problem(upper=sine.build(1.0, period=0.5), accuracy=1e-3))
    assert solved.run.errors.kind == "exact"
    assert solved.parts["settling"]["regime"] == "periodic"
    assert all(demand.ratio <= 1.0 for demand in solved.wanted)


def test_a_quiet_time_before_the_first_change_costs_nothing_and_changes_nothing():
    now, later = (
        solve(problem(upper=step.build(1.0, at=at), lower=constant(0.0), duration=at + 2.0)).parts for at in (0.0, 8.0)
    )
    assert later["settling"]["time"] - 8.0 == pytest.approx(now["settling"]["time"], rel=1e-4)
