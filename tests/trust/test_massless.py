"""The hand formula for bodies: film resistance and inertia, and small linear systems in closed form."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from carried import carried
from problems import lag, ramp, sine, trapezoid
from scipy.integrate import solve_ivp

from transient.answer import solve
from transient.trust.forced import Linear, forced
from transient.trust.hand_formula import compare
from transient.trust.massless import film_of
from transient.trust.preview import hand_history, preview


def test_a_film_between_plates_resists_and_carries_by_its_linear_profile():
    """mu A/h; a third and a sixth of the film's mass (integrals of (y/h)^2 and (y/h)(1 - y/h))."""
    film = film_of(carried(upper={"mass": 1.0, "area": 3.0}, lower={"mass": 1.0, "area": 3.0}, viscosity=0.5,
                           density=6.0, outer=2.0))  # fmt: skip
    assert film.resistance == pytest.approx(0.75 * np.array([[-1.0, 1.0], [1.0, -1.0]]), rel=1e-12)
    assert film.inertia == pytest.approx(36.0 * np.array([[1 / 3, 1 / 6], [1 / 6, 1 / 3]]), rel=1e-12)


# First roots of x tan x = C: Essentials of Applied Mathematics for Scientists and Engineers, Table A.1
@pytest.mark.parametrize(("c", "root"), [(0.01, 0.0998), (0.1, 0.3111)])
def test_the_film_s_inertia_is_right_to_first_order(c, root):
    """x^2 = C/(1 + C/3) + O(C^3): the massless film's time constant lengthened by a third of the film's mass."""
    film = film_of(carried(upper={"mass": 1.0 / c}))
    rate = -film.resistance[1, 1] / (1.0 / c + film.inertia[1, 1])
    assert math.sqrt(rate) == pytest.approx(root, abs=5e-5)


def test_a_bore_around_fluid_that_moves_with_it_carries_it_all():
    film = film_of(carried("pipe", upper={"mass": 1.0, "area": 2.0 * math.pi}, density=7.0))
    assert film.inertia[1, 1] == pytest.approx(7.0 * math.pi, rel=1e-12)  # of unit length and radius
    assert film.resistance[1, 1] == pytest.approx(0.0, abs=1e-14)


def test_concentric_cylinders_hold_by_their_torque():
    """4 pi mu R1^2 R2^2/(R2^2 - R1^2) per length and difference of speed (from memory)."""
    film = film_of(carried("annulus_rotating", lower={"mass": 1.0, "area": math.pi}, inner=0.5, outer=1.5))
    assert -film.resistance[0, 0] == pytest.approx(4 * math.pi * 0.25 * 2.25 / 2.0, rel=1e-12)


INPUTS = {
    "ramp and hold": (ramp.build(2.0, 0.7), 0.0),
    "trapezoid": (trapezoid.build(1.0, 0.2, 0.5, 0.4), 0.3),
    "sine": (sine.build(1.0, period=0.9), 0.0),
    "a lag that meets the film's rate": (lag.build(1.0, 1.0), 0.0),
}
SYSTEMS = {
    "decay": np.array([[-1.0]]),
    "nothing holds": np.array([[0.0]]),
    "swing": np.array([[-0.3, -9.0], [1.0, 0.0]]),
    "critical": np.array([[-4.0, -4.0], [1.0, 0.0]]),
}


@pytest.mark.parametrize("drive", INPUTS)
@pytest.mark.parametrize("name", SYSTEMS)
def test_linear_systems_in_closed_form(name, drive):
    matrix = SYSTEMS[name]
    load, speed = INPUTS[drive]
    case = carried(upper={"mass": 1.0, "load": load}, lower=speed)
    inputs = case.inputs(2.0)
    source = np.zeros((len(matrix), 3))
    source[0] = [0.5, 1.0, 0.0]
    starts = inputs.starts
    ends = np.append(starts[1:], 2.0)
    piece = np.repeat(np.arange(len(starts)), 3)
    offset = ((ends - starts)[:, None] * [0.0, 0.5, 1.0]).ravel()
    state = np.arange(1.0, len(matrix) + 1)
    found, rates = forced(Linear(matrix, source), inputs, piece, offset, state)
    for number in range(len(starts)):

        def rate(x, z, number=number):
            at = np.array([number]), np.array([x])
            return matrix @ z + source @ np.array([inputs.row(row).at(*at)[0] for row in range(3)])

        end = ends[number] - starts[number]
        true = solve_ivp(rate, (0.0, end), state, "DOP853", [0.5 * end, end], rtol=1e-11, atol=1e-13).y.T
        rows = np.flatnonzero(piece == number)
        assert found[rows[0]] == pytest.approx(state, rel=1e-6, abs=1e-7)  # critical damping costs half of the digits
        assert found[rows[1:]] == pytest.approx(true, rel=1e-6, abs=1e-7)
        assert rates[rows[1]] == pytest.approx(rate(0.5 * end, true[0]), rel=1e-6, abs=1e-6)
        state = true[-1]


def said(case):
    solved = solve(case, "refinement")
    peaks = {name: wall["peak_stress"] for name, wall in solved.parts["walls"].items()}
    parts = solved.parts
    return compare(case, solved.run.history, peaks, parts["bodies"], parts["pressure"]["peak_drop_per_length"]), parts


def test_a_heavy_block_needs_no_more_than_the_massless_film():
    found, parts = said(carried(upper={"mass": 1e4, "load": ramp.build(1.0, 50.0)}))
    assert found["enough"] is True
    hand = found["bodies"]["upper"]["massless_film"]
    assert hand["time_constant"] == pytest.approx(1e4, rel=1e-12)
    assert hand["speed_settling_time"] == pytest.approx(parts["bodies"]["upper"]["speed_settling_time"], rel=1e-3)
    assert found["peak_stress"]["upper"] == pytest.approx(-1.0, rel=1e-4)
    assert "settling time" in found["note"]


def test_the_film_s_inertia_mends_what_the_massless_film_misses():
    """Body and film of like mass: the first root of x tan x = 1 makes 1/x^2 = 1.351, massless 1, corrected 4/3."""
    found, _ = said(carried(upper={"mass": 1.0, "load": ramp.build(1.0, 1.0)}))
    massless, corrected = (found["bodies"]["upper"][name] for name in ("massless_film", "film_inertia"))
    assert corrected["time_constant"] == pytest.approx(4.0 / 3.0, rel=1e-12)
    assert massless["enough"] is False
    assert corrected["enough"] is True
    assert corrected["settling_difference"] < 0.03 < 0.15 < massless["settling_difference"]
    assert found["enough"] is False
    assert "settling" in found["note"]


def test_curves_and_friction_by_integration():
    """Falling straight curve F = 1 - U: one more resistance, so the time constant halves (massless film)."""
    curve = ((0.0, 1.0), (1.0, 0.0))
    found, _ = said(carried(upper={"mass": 100.0, "curve": curve}, accuracy=1e-3))
    hand = found["bodies"]["upper"]["massless_film"]
    assert hand["time_constant"] == pytest.approx(50.0, rel=1e-6)
    assert hand["speed_settling_time"] == pytest.approx(50.0 * math.log(100.0), rel=1e-3)
    assert hand["peak_stress"] == pytest.approx(-0.5, rel=1e-3)


def test_a_body_without_mass_has_no_massless_formula():
    found, _ = said(carried(upper={"mass": 0.0, "load": ramp.build(1.0, 1.0)}, accuracy=1e-3))
    assert found["bodies"]["upper"]["massless_film"] is None
    assert found["bodies"]["upper"]["film_inertia"]["time_constant"] == pytest.approx(1.0 / 3.0, rel=1e-9)
    assert found["peak_stress"]["upper"] == pytest.approx(-1.0, rel=1e-2)


def test_the_pressure_of_a_fast_flow_is_missed_and_of_a_sudden_one_not_compared():
    case = carried("pipe", flow=ramp.build(1.0, 0.05), accuracy=1e-3)
    found, _ = said(case)
    assert found["peak_drop_per_length"] == pytest.approx(8.0, rel=1e-9)  # Hagen-Poiseuille: 8 mu V/R^2
    assert found["drop_difference"] > 0.5
    assert found["enough"] is False
    history = hand_history(replace(case, duration=1.0), 1.0)
    assert compare(case, history, {"bore": 4.0}, None, None)["drop_difference"] is None


def test_what_is_judged_before_solving_knows_the_speed_that_a_body_reaches():
    """Reynolds number U h/nu at the terminal speed U = F h/(mu A), to what five time constants leave."""
    case = carried(upper={"mass": 50.0, "load": ramp.build(900.0, 0.1)})
    (found,) = [check for check in preview(case, 0.2) if check.name == "Reynolds number, wall-driven"]
    assert found.value == pytest.approx(900.0, rel=0.01)
    assert found.status == "pass"
    loaded = carried(upper={"mass": 50.0, "load": ramp.build(2000.0, 0.1)})
    (found,) = [check for check in preview(loaded, 0.2) if check.name == "Reynolds number, wall-driven"]
    assert found.status == "fail"


def test_a_flow_is_judged_by_the_pressure_that_it_needs():
    names = {check.name for check in preview(carried(flow=ramp.build(1.0, 0.1), length=50.0), 0.2)}
    assert {"Reynolds number, pressure-driven", "entrance length", "pressure-wave time"} <= names
