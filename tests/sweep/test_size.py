"""The value of one input at which a number meets its limit: against closed forms, and where there is none."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest
from scipy import optimize

import transient as tr
from transient.case.model import CaseError
from transient.sweep import size as sizes
from transient.sweep.goal import read_goal
from transient.sweep.size import size

CASE = tr.Case(
    {
        "gap": {"shape": "plates", "height": "0.8 mm", "length": "60 mm", "width": "25 mm"},
        "fluid": {"density": "998 kg/m^3", "viscosity": "1.002 mPa*s"},
        "wall": {"upper": {"speed": {"kind": "ramp", "to": "0.3 m/s", "over": "50 ms"}}},
        "run": {"accuracy": "1 %"},
    }
)


def sized(key, between, meet, case=CASE):
    """The answer, nobody watching."""
    return size(case, key, between, read_goal(meet, case), lambda count: None)


def test_the_gap_at_which_the_final_stress_is_that_of_plane_shear():
    found = sized("gap.height", ("0.2 mm", "3 mm"), "upper.final_stress <= 0.5 Pa")
    # plane Couette flow: stress = viscosity x speed / height
    assert found.found.value == pytest.approx(1.002e-3 * 0.3 / 0.5, rel=2e-3)
    assert found.found.magnitude <= 0.5
    assert found.found.magnitude == pytest.approx(0.5, abs=2 * found.found.error + 1e-9)
    assert found.met == ((found.found.value, 3e-3),)
    assert found.monotone


def test_settling_scales_with_the_square_of_the_gap():
    # the same flow in units of height^2 / kinematic viscosity: a sudden pressure, which has no time of its own
    tree = {**CASE.tree, "wall": {}, "pressure": {"drop_per_length": "10 Pa/m"}}
    case = tr.Case(tree)
    one = tr.run(case).settling.time
    found = sized("gap.height", ("0.1 mm", "5 mm"), f"settling.time <= {4 * one!r} s", case)
    assert found.found.value == pytest.approx(1.6e-3, rel=1e-2)
    assert found.met == ((1e-4, found.found.value),)


@pytest.mark.parametrize("sign", ["<=", ">="])
def test_it_meets_the_limit_on_the_right_side_whichever_that_is(sign):
    found = sized("wall.upper.speed.over", ("5 ms", "500 ms"), f"upper.peak_force {sign} 2 mN")
    assert found.goal.met(found.found.magnitude)
    assert found.found.magnitude == pytest.approx(2e-3, rel=1e-3)
    inside = (found.found.value, 0.5) if sign == "<=" else (0.005, found.found.value)
    assert found.met == (inside,)


def planted(monkeypatch, function):
    """Let ``upper.final_stress`` be a function of the gap's height; returns the heights asked for."""
    asked = []

    class Answer:
        def __init__(self, case):
            height = case.gap.sizes["height"]
            asked.append(height)
            wall = {"final_stress": function(height), "final_stress_error": 1e-9}
            self.summary = {"walls": {"upper": wall}, "verdict": "good"}

    monkeypatch.setattr(sizes, "run", Answer)
    return asked


# A third moving limit, away from any value of the scan.
CURVES = {
    "line": (lambda h: 3.0 * h, 1.2345),
    "steep": (lambda h: math.exp(9.0 * h), 1000.0),
    "root": (lambda h: math.sqrt(h), 0.6),
    "falling": (lambda h: 1.0 / h, 1.7),
    "step": (lambda h: 0.0 if h < 0.4321 else 5.0, 2.0),
}


@pytest.mark.parametrize("name", list(CURVES))
def test_the_crossing_is_scipys_root_in_few_evaluations(monkeypatch, name):
    function, limit = CURVES[name]
    asked = planted(monkeypatch, function)
    found = sized("gap.height", ("0.2 m", "1.0 m"), f"upper.final_stress <= {limit} Pa")
    expected = optimize.brentq(lambda h: function(h) - limit, 0.2, 1.0, xtol=1e-14)
    assert found.found.value == pytest.approx(expected, abs=1e-6)
    assert function(found.found.value) <= limit
    assert found.evaluations == len(asked) == len(set(asked))
    assert found.evaluations <= (40 if name == "step" else 20)


def test_a_limit_met_everywhere_or_nowhere_says_the_values_at_both_ends(monkeypatch):
    planted(monkeypatch, lambda h: 3.0 * h)
    for limit, met in ((9.0, ((0.2, 1.0),)), (0.1, ())):
        found = sized("gap.height", ("0.2 m", "1.0 m"), f"upper.final_stress <= {limit} Pa")
        assert found.found is None
        assert [end.magnitude for end in found.ends] == [pytest.approx(0.6), pytest.approx(3.0)]
        assert found.met == met
        assert found.as_dict()["value"] is None


def hump(height: float) -> float:
    """Rises to 1 at 0.5 and falls again, narrow."""
    return math.exp(-(((height - 0.5) / 0.1) ** 2))


def test_a_quantity_that_turns_back_is_met_on_both_sides_and_said_to_turn(monkeypatch):
    planted(monkeypatch, hump)
    found = sized("gap.height", ("0.1 m", "1.0 m"), "upper.final_stress <= 0.5 Pa")
    half = 0.1 * math.sqrt(math.log(2.0))
    assert not found.monotone
    np.testing.assert_allclose(np.array(found.met).ravel(), [0.1, 0.5 - half, 0.5 + half, 1.0], atol=2e-6)
    assert found.found.value == pytest.approx(0.5 + half, abs=2e-6)  # the wider of the two


def test_a_turn_between_the_values_of_the_scan_is_looked_at_more_closely(monkeypatch):
    # between 0.44 and 0.56 of the scan the hump is at 0.66 only; the limit lies above
    planted(monkeypatch, lambda h: hump(h + 0.01))
    found = sized("gap.height", ("0.12 m", "1.0 m"), "upper.final_stress <= 0.995 Pa")
    assert len(found.met) == 2


def test_an_infinite_stress_meets_no_upper_limit_and_every_lower_one():
    tree = {**CASE.tree, "wall": {"upper": {"speed": "0.3 m/s"}}}
    case = tr.Case(tree)
    assert sized("gap.height", ("0.5 mm", "2 mm"), "upper.peak_stress <= 5 Pa", case).met == ()
    found = sized("gap.height", ("0.5 mm", "2 mm"), "upper.peak_stress >= 5 Pa", case)
    assert found.met == ((5e-4, 2e-3),)
    assert json.loads(json.dumps(found.as_dict(), allow_nan=False))["ends"][0]["at_value"] is None


def test_a_time_that_is_not_reached_counts_as_infinite():
    case = CASE.replace({"run.duration": "0.3 s"})
    found = sized("gap.height", ("0.1 mm", "4 mm"), "settling.time <= 0.1 s", case)
    assert math.isinf(found.ends[1].magnitude)
    assert found.found.magnitude == pytest.approx(0.1, rel=1e-3)


HEIGHTS = ("1 mm", "2 mm")
STRESS = "upper.peak_stress <= 2 Pa"


@pytest.mark.parametrize(
    ("key", "between", "meet", "message"),
    [
        ("gap.height", HEIGHTS, "upper.peak_stress < 2", '--meet upper.peak_stress: "2" has no unit; a pressure'),
        ("gap.height", HEIGHTS, "upper.peak_stress = 2 Pa", '--meet "upper.peak_stress = 2 Pa" is no condition; '),
        ("gap.height", HEIGHTS, "peak_stress <= 2 Pa", '--meet "peak_stress <= 2 Pa" is no condition; '),
        ("gap.height", HEIGHTS, "top.peak_stress <= 2 Pa", '--meet "top.peak_stress" is no quantity of this case;'),
        ("gap.height", HEIGHTS, "upper.peak_torque <= 2 N*m", "did you mean"),
        ("gap.height", HEIGHTS, "upper.peak_stress <= -2 Pa", "is below zero; magnitudes are compared"),
        ("gap.height", ("1 mm", "1 mm"), STRESS, "--between gap.height: the ends are the same"),
        ("gap.height", ("1 mm", "2 s"), STRESS, '--between gap.height: "2 s" is a time; a length is'),
        ("gap.heigth", HEIGHTS, STRESS, "--vary: gap.heigth: unknown key; did you mean"),
        ("start.state", ("rest", "steady"), STRESS, "--vary start.state: is no quantity between"),
        ("gap.height", ("-1 mm", "2 mm"), STRESS, 'gap.height: "-0.001 m" is not above zero'),
    ],
)
def test_refusals_are_one_line(key, between, meet, message):
    with pytest.raises(CaseError) as refusal:
        sized(key, between, meet)
    assert message in str(refusal.value)
    assert "\n" not in str(refusal.value)


def test_the_command_says_the_value_the_quantity_its_error_and_the_count(sweep_file, call, tmp_path):
    sweep_file("")
    question = ["--vary", "wall.upper.speed.over", "--between", "1 ms", "500 ms", "--meet"]
    status, out, err = call("size", tmp_path / "case.toml", *question, "upper.peak_stress <= 2 Pa", "--json")
    assert status == 0
    said = json.loads(out)
    contract = {"key", "value", "unit", "quantity", "at_value", "error", "evaluations"}
    assert contract <= set(said)
    assert (said["key"], said["unit"], said["quantity"]) == ("wall.upper.speed.over", "s", "upper.peak_stress")
    assert said["at_value"] <= 2.0 <= said["at_value"] + said["error"]
    # Stokes's first problem under a ramp, walls far apart: stress = 2 mu U / T sqrt(T / (pi nu)) at its end (Carslaw &
    # Jaeger 1959, section 2.9, as a flux that follows from a surface that warms linearly)
    expected = 4.0 * 1.002e-3 * 998.0 * 0.3**2 / (math.pi * 2.0**2)
    assert said["value"] == pytest.approx(expected, rel=1e-3)
    assert call("size", tmp_path / "case.toml", *question, "upper.peak_stress <= 2 Pa")[1] == err
    assert err.startswith("wall.upper.speed.over = 28.6")
    assert f"({said['evaluations']} evaluations)" in err


def test_the_command_ends_with_1_where_the_limit_is_met_nowhere_or_everywhere(sweep_file, call, tmp_path):
    sweep_file("")
    question = ["size", tmp_path / "case.toml", "--vary", "gap.height", "--between", "0.5 mm", "2 mm", "--meet"]
    status, out, _ = call(*question, "upper.final_stress <= 1 kPa")
    assert status == 1
    assert out.startswith("upper.final_stress <= 1 kPa is met everywhere between 0.5 mm and 2 mm: upper.final_stress ")
    status, out, err = call(*question, "upper.final_stress >= 1 kPa", "--json")
    assert status == 1
    assert json.loads(out)["value"] is None
    assert "is met nowhere between 0.5 mm and 2 mm" in err
    status, out, err = call(*question, "upper.final_stres >= 1 kPa")
    assert (status, out) == (2, "")
