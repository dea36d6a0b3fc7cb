"""What is asked of each headline number, and when it counts as met."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from problems import problem, ramp, trapezoid

from transient.answer import solve
from transient.drive.pieces import total
from transient.trust.demand import FINAL_SHARE, HISTORY_SHARE, Demand, demands, unmet


def wanted(flow, **changes):
    """Demands of a solved case whose errors are changed after the fact."""
    solved = solve(flow)
    errors = replace(solved.run.errors, **{k: change(getattr(solved.run.errors, k)) for k, change in changes.items()})
    calm = solved.ladder.best.steady_stress
    found = demands(replace(solved.run, errors=errors), solved.parts, flow.accuracy, calm)
    return {demand.name: demand for demand in found}, solved


def test_every_number_with_an_error_is_asked_for():
    found, _ = wanted(problem(upper=ramp.build(1.0, 0.1)))
    assert set(found) == {
        "lower peak stress", "lower stress history", "lower final stress",
        "upper peak stress", "upper stress history", "upper final stress",
        "mean velocity history", "peak mean velocity",
        "settling time", "flow settling", "lower stress settling", "upper stress settling",
    }  # fmt: skip
    assert not unmet(list(found.values()))


def test_an_infinite_peak_is_not_asked_for_but_its_history_is_by_the_local_value():
    found, _ = wanted(problem(upper=1.0))
    assert "upper peak stress" not in found
    assert found["upper stress history"].allowed == pytest.approx(HISTORY_SHARE * 1e-3, rel=1e-12)
    assert 0.0 < found["upper stress history"].ratio <= 1.0
    assert "upper final stress" in found
    assert "lower peak stress" in found


def test_allowances_are_the_contract_s():
    """Peak: of itself; stored history: of the wall's largest; final: of itself, at least 1 % of the peak."""
    flow = problem(upper=ramp.build(1.0, 0.01), push=-1.9)  # upper wall: -1 + 0.95 at the end
    found, solved = wanted(flow)
    peak = abs(solved.parts["walls"]["upper"]["peak_stress"])
    assert found["upper peak stress"].allowed == pytest.approx(1e-3 * peak, rel=1e-6)
    assert found["upper stress history"].allowed == pytest.approx(HISTORY_SHARE * 1e-3 * peak, rel=1e-6)
    final = abs(solved.parts["walls"]["upper"]["final_stress"])
    assert found["upper final stress"].allowed == pytest.approx(1e-3 * max(final, FINAL_SHARE * peak), rel=1e-6)
    time = solved.parts["settling"]["time"]
    assert found["settling time"].allowed == pytest.approx(1e-3 * time, rel=1e-12)


def test_a_final_stress_of_zero_is_relative_to_the_peak():
    found, solved = wanted(problem(upper=trapezoid.build(1.0, 0.1, 0.1, 0.1)))
    peak = abs(solved.parts["walls"]["upper"]["peak_stress"])
    assert found["upper final stress"].allowed == pytest.approx(1e-3 * peak, rel=1e-6)


def test_a_wall_that_nothing_reaches_is_judged_beside_the_other():
    found, solved = wanted(problem(upper=1.0, duration=1e-3))
    assert abs(solved.parts["walls"]["lower"]["peak_stress"]) < 1e-12
    assert found["lower peak stress"].ratio <= 1.0
    assert found["lower peak stress"].allowed > 0.0


@pytest.mark.parametrize(
    ("name", "error"),
    [("upper stress history", "stress"), ("mean velocity history", "mean"), ("peak mean velocity", "mean_peak")],
)
def test_a_planted_error_is_missed(name, error):
    """Negative control for each kind: raised by a hundredth, the number is no longer met."""
    found, _ = wanted(problem(upper=ramp.build(1.0, 0.1)), **{error: lambda value: value + 0.01})
    assert found[name].ratio > 1.0
    assert name in [demand.name for demand in unmet(list(found.values()))]


def test_an_infinite_error_is_never_met():
    assert Demand("x", np.inf, 1.0).ratio == np.inf
    assert Demand("x", 1.0, 0.0).ratio == np.inf
    assert Demand("x", 0.0, 0.0).ratio == 0.0


def test_the_worst_comes_first_and_grazes_are_left_out():
    many = [Demand("a", 2.0, 1.0), Demand("b", 9.0, 1.0, grazes=True), Demand("c", 5.0, 1.0), Demand("d", 0.5, 1.0)]
    assert [demand.name for demand in unmet(many)] == ["c", "a"]


def test_a_deviation_that_runs_along_the_band_grazes_and_says_so():
    """99 % of the speed for a long time, the rest at t = 50: the deviation lies on the 1 % band meanwhile."""
    most = ramp.build(0.99, 0.1)
    rest = ramp.build(0.01, 1.0, at=50.0)
    solved = solve(problem(upper=total([most, rest])))
    said = solved.parts["settling"]
    asked = {demand.name: demand for demand in solved.wanted}["settling time"]
    # either the early or the late time is right to round-off; the other must lie within the stated error
    assert said["reached"]
    assert asked.grazes
    assert said["time"] - said["error"] < 5.0
    assert said["time"] + said["error"] > 50.0
    assert not [demand for demand in unmet(solved.wanted) if demand.name == "settling time"]
