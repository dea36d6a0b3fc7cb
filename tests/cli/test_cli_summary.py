"""The printed summary, to the letter, of made-up results."""

from __future__ import annotations

import copy
from pathlib import Path

import numpy as np
import pytest

from transient.cli.summary import describe
from transient.result.result import Result, Variable

PASSED = {"name": "a", "kind": "numerics", "status": "pass", "value": 1.0, "limit": 2.0, "source": "s", "note": "n"}
SUMMARY = {
    "title": "Flow cell brought up to speed",
    "shape": "plates",
    "verdict": "good",
    "settling": {
        "reached": True,
        "time": 0.27143,
        "error": 2.3e-4,
        "within": 0.01,
        "regime": "steady",
        "period": None,
        "velocity": 0.27143,
        "flow": 0.2511,
        "stress": {"lower": 0.2712, "upper": 0.2534},
    },
    "walls": {
        "lower": {
            "peak_stress": 0.37575,
            "peak_stress_error": 1e-5,
            "peak_time": 0.9,
            "unbounded": False,
            "final_stress": 0.37575,
            "final_stress_error": 1e-6,
            "final_speed": 0.0,
            "overshoot": 0.0,
            "peak_force": 5.6e-4,
            "peak_torque": None,
        },
        "upper": {
            "peak_stress": -1.3217,
            "peak_stress_error": 1.2e-4,
            "peak_time": 0.05,
            "unbounded": False,
            "final_stress": -0.37575,
            "final_stress_error": 1e-6,
            "final_speed": 0.3,
            "overshoot": 2.5175,
            "peak_force": -1.98e-3,
            "peak_torque": None,
        },
    },
    "flow": {
        "peak_mean_velocity": 0.16,
        "final_mean_velocity": 0.15,
        "peak_flow_rate": 3.2e-6,
        "volume_delivered": 2.5e-6,
    },
    "pressure": {"peak_drop_per_length": 0.0, "final_drop_per_length": 0.0},
    "quasi_steady": {
        "enough": False,
        "peak_stress": {"lower": 0.37575, "upper": -0.37575},
        "note": "the hand formula misses the peak on the upper wall by 71.6 %",
    },
    "checks": [PASSED] * 8,
    "accuracy": {"asked": 0.001, "met": True, "worst": None, "reached": 0.001},
    "numerics": {"points": 128, "steps": 240, "seconds": 0.011},
}
PRINTED = """\
Flow cell brought up to speed

Settled    after 271.43 ± 0.23 ms: velocity within 1 % of its steady state
           flow after 251.1 ms; wall stress on lower after 271.2 ms and on upper
           after 253.4 ms

Wall       largest stress         at       in the end              speed then
lower      0.37575 ± 0.00001 Pa   900 ms   0.37575 ± 0.00001 Pa    0 m/s
upper      -1.3217 ± 0.0002 Pa    50 ms    -0.37575 ± 0.00001 Pa   0.3 m/s
           largest over final stress: 3.52 times on upper
           largest force 560 µN on lower and -1.98 mN on upper

Flow       mean velocity 0.15 m/s in the end, largest 0.16 m/s; largest flow
           rate 3.2 cm³/s; 2.5 cm³ delivered in the run
By hand    0.3757 Pa on lower and -0.3757 Pa on upper at most, as if the flow
           were steady at every instant. Not enough here: the hand formula
           misses the peak on the upper wall by 71.6 %

Trust      good (8 of 8 checks passed); all numbers within the 0.1 % asked
File       outputs/flow_cell.h5   (128 points, 240 steps, 11 ms)"""


def printed(speed_unit: str = "m/s", **changes: object) -> str:
    """The summary with some of its parts replaced, as printed."""
    summary = {**copy.deepcopy(SUMMARY), **changes}
    variables = {"wall_speed": Variable(("time", "wall"), np.zeros((1, 2)), speed_unit, "speed of the wall")}
    return describe(Result(variables, summary, ""), Path("outputs/flow_cell.h5"))


def test_printed_to_the_letter():
    assert printed() == PRINTED


def test_an_unbounded_start_states_its_law_and_no_peak():
    walls = copy.deepcopy(SUMMARY["walls"])
    # K = U sqrt(density viscosity / pi) (Stokes' first problem): 0.3 m/s in water.
    walls["upper"] |= {
        "unbounded": True,
        "peak_stress": None,
        "peak_stress_error": None,
        "peak_time": 0.0,
        "unbounded_coefficient": 0.169256,
        "unbounded_exponent": 0.5,
    }
    text = " ".join(printed(walls=walls).split())
    assert "upper unbounded 0 s -0.37575 ± 0.00001 Pa 0.3 m/s" in text
    assert "upper: a jump at 0 s makes the stress infinite there. It falls as K / sqrt(t) with" in text
    assert "K = 0.1693 Pa s^0.5, t from the jump on: 5.352 Pa after 1 ms" in text


def test_a_flow_that_does_not_settle_is_said_so():
    nothing = {"time": None, "error": None, "velocity": None, "flow": None, "stress": {}, "period": None}
    endless = {"reached": False, "within": 0.02, "regime": "none", **nothing}
    short = {**endless, "regime": "steady"}
    assert "not within 2 % in this run, since the drive ends in no steady or" in printed(settling=endless)
    assert "not within 2 % in this run, since the run ends before that" in printed(settling=short)


def test_a_periodic_end_names_its_period_and_no_overshoot():
    text = printed(settling={**SUMMARY["settling"], "regime": "periodic", "period": 0.125})
    assert "velocity within 1 % of its periodic state" in text
    assert "(period 125 ms)" in text
    assert "over final" not in text


@pytest.mark.parametrize(
    ("verdict", "kind", "status", "words"),
    [
        ("caution", "validity", "caution", ["good, with a caution (8 of 9 checks passed)", "caution (a): close"]),
        ("outside", "validity", "fail", ["outside what this model describes: do not rely on", "OUTSIDE (a): close"]),
        ("failed", "numerics", "fail", ["a self-check failed: do not rely on", "FAILED (a): close"]),
    ],
)
def test_cautions_and_failures_are_sentences(verdict, kind, status, words):
    checks = [*SUMMARY["checks"], {**PASSED, "kind": kind, "status": status, "note": "close to the limit"}]
    text = " ".join(printed(verdict=verdict, checks=checks).split())
    for word in words:
        assert word in text


def test_an_accuracy_that_was_not_reached_is_said():
    text = " ".join(printed(accuracy={"asked": 1e-4, "met": False, "worst": "settling", "reached": 3.2e-4}).split())
    assert "accuracy asked 0.01 %, reached 0.032 % (settling)" in text


def test_a_turning_wall_reads_in_turns_per_minute_and_torque():
    walls = copy.deepcopy(SUMMARY["walls"])
    for wall in walls.values():
        wall |= {"final_speed": 2.0 * np.pi, "peak_force": None, "peak_torque": 0.012}
    text = printed("rad/s", walls=walls)
    assert "60 rpm" in text
    assert "largest torque 12 mN·m on lower and 12 mN·m on upper" in text


def test_a_body_is_told_by_speed_way_and_what_holds_it():
    body = {
        "terminal_speed": 0.4258,
        "speed_settling_time": 25.492,
        "speed_settling_error": 0.019,
        "peak_speed": 0.5,
        "peak_speed_time": 3.0,
        "peak_acceleration": 0.08,
        "peak_acceleration_time": 0.0,
        "final_position": 22.63,
        "coast_down": {"begins": 5.0, "speed": 0.4, "time": 1.5, "distance": 0.2},
        "standstills": [[0.0, 0.25], [8.0, None]],
    }
    assert (
        "on upper: ends at 0.4258 m/s, within 1 % after 25.492 ± 0.019 s; largest speed 0.5 m/s at 3 s; largest "
        "acceleration 0.08 m/s^2 at 0 s; at the end 22.63 m from its zero; coasts from 0.4 m/s for 1.5 s and 200 mm; "
        "held by dry friction from 0 s to 250 ms and 8 s on"
    ) in " ".join(printed(bodies={"upper": body}).split())


def test_a_pressure_that_follows_from_the_flow_is_told_with_its_error():
    pressure = {"peak_drop_per_length": 1.0e4, "peak_drop_per_length_error": 12.0, "final_drop_per_length": 950.0}
    assert "drop per length 950 Pa/m in the end, largest 10.000 ± 0.012 kPa/m" in printed(pressure=pressure)
    sudden = {"peak_drop_per_length": None, "unbounded": True, "peak_time": 0.1, "final_drop_per_length": 950.0}
    assert "drop per length 950 Pa/m in the end, after an impulse at 100 ms" in printed(pressure=sudden)


def test_no_line_is_wider_than_80_columns():
    note = "this sentence is long enough that it has to be broken over several lines of the terminal, twice over " * 2
    checks = [{**PASSED, "status": "caution", "note": note.strip()}]
    assert max(map(len, printed(checks=checks).splitlines())) <= 80
