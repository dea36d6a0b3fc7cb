"""Periodic ends of bodies and prescribed flow: against finite elements long after the start, and for deviations."""

from __future__ import annotations

import numpy as np
import pytest
from closed_cases import AREA, PLATES
from reference.cases import tree_of
from reference.closed import Plant

from transient.case.model import Case
from transient.series.gapshape import SeriesError
from transient.series.regime import deviation, periodic

CYCLE = {"kind": "trapezoid", "to": 1e-3, "rise": 0.1, "hold": 0.3, "fall": 0.1}
REPEATED = {"kind": "repeat", "every": 1.0, "part": CYCLE}
WAVE = {"kind": "sine", "amplitude": 1e-3, "period": 1.0, "phase": 0.4, "mean": 2e-4}
BELT = {"kind": "repeat", "every": 1.0, "part": CYCLE | {"to": 0.1}}

CASES = {
    "pushed again and again": {"walls": {"upper": {"body": {"mass": 5e-3, "area": AREA, "force": REPEATED}}}},
    "shaken": {"walls": {"upper": {"body": {"mass": 5e-3, "area": AREA, "force": WAVE}}}},
    "sprung and pushed": {"walls": {
        "upper": {"body": {"mass": 0.02, "area": AREA, "stiffness": 3.0, "damping": 0.1, "force": REPEATED}}}},
    "pulsating flow": {"pressure": {"mean_velocity": BELT}},
    "belt in a sealed gap": {"pressure": {"sealed": True}, "walls": {"upper": {"speed": BELT}}},
}  # fmt: skip
LATE = 20.0  # s: what the starts left has gone to 1e-9 or less by then
WITHIN = np.array([0.03, 0.1, 0.25, 0.47, 0.6, 0.93])


def problem(plain):
    return Case(tree_of(PLATES | plain | {"duration": LATE + 1.0, "accuracy": 1e-3, "settle_within": 0.01})).problem()


@pytest.mark.parametrize("name", CASES)
def test_the_orbit_is_what_a_long_run_ends_in(name):
    case = problem(CASES[name])
    orbit = periodic(case)
    at = orbit.locate(np.nextafter(WITHIN, 0.0))
    walls, speeds = orbit.stress_and_mean(*at)[0].T, orbit.speeds(*at)[0].T
    true = Plant(PLATES | CASES[name]).run(LATE + 1.0).at(LATE + WITHIN)
    for found, exact in ((walls[:2], true["stress"]), (walls[2], true["mean"]), (speeds, true["speed"])):
        np.testing.assert_allclose(found, exact, rtol=0, atol=3e-6 * np.abs(exact).max() + 1e-13)


@pytest.mark.parametrize("name", CASES)
def test_the_deviation_is_the_flow_less_its_orbit(name):
    case = problem(CASES[name])
    away = deviation(case, LATE + 1.0)
    run = Plant(PLATES | CASES[name]).run(LATE + 1.0)
    times = np.array([0.02, 0.1, 0.55, 1.3])
    at = away.locate(np.nextafter(times, 0.0))
    found, bound = away.stress_and_mean(*at)
    now, then = run.at(times), run.at(LATE + times % 1.0)
    size = np.abs(now["stress"]).max()
    np.testing.assert_allclose(found[:, :2].T, now["stress"] - then["stress"], rtol=0, atol=3e-6 * size)
    assert bound[:, :2].max() < 1e-9 * size
    last = away.locate(np.array([LATE + 0.9999]))
    assert np.abs(away.speeds(*last)[0]).max() < 1e-6 * np.abs(now["speed"]).max() + 1e-12


def test_a_free_body_has_no_orbit():
    both = {name: {"body": {"mass": 5e-3, "area": AREA, "force": REPEATED}} for name in ("lower", "upper")}
    with pytest.raises(SeriesError, match="holds"):
        periodic(problem({"walls": both}))
