"""Headline numbers of solved cases against closed forms.

Tables of start-up times: the series of Christov 2013 (arXiv 1305.5999) for plane Couette flow and of Szymanski 1932
(J. Math. Pures Appl. 11, 67) for pipes and plates under pressure, evaluated independently at the digits given; no
published table of these times is known.
"""

from __future__ import annotations

import numpy as np
import pytest
from problems import SHAPES, constant, lag, problem, ramp, sine, step, trapezoid
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq
from scipy.special import erfc, jn_zeros

from transient.answer import SolveError, solve
from transient.drive.pieces import Drive, Eventual


def parts(accuracy=1e-4, judge="series", **case):
    return solve(problem(accuracy=accuracy, **case), judge).parts


def within(found, error, true, accuracy):
    """The number is as accurate as asked for, and the stated error covers the difference."""
    assert abs(found - true) <= accuracy * abs(true)
    assert abs(found - true) <= error + 1e-5 * abs(true)  # the table's own digits


# --- start-up of plane Couette flow: T, mid velocity, moving and fixed wall stress over mu U / h
COUETTE = [
    (0.01, 0.0004069520, 5.641895835, 1.567087e-10),
    (0.05, 0.1138441966, 2.523132532, 0.0340014664),
    (0.1, 0.2627562698, 1.784286114, 0.2928996518),
    (0.2, 0.4115664301, 1.278566999, 0.7229223898),
    (0.5, 0.4954215049, 1.014383772, 0.9856162386),
    (1.0, 0.4999670720, 1.000103446, 0.9998965536),
]


def test_start_up_of_plane_couette_flow():
    solved = solve(problem(upper=1.0, duration=1.2, accuracy=1e-4))
    h = solved.run.history
    times = np.array([row[0] for row in COUETTE])
    profiles, _ = h.profiles_at(times)
    middle = CubicSpline(h.position, profiles, axis=1)(0.5)
    for i, (time, velocity, moving, fixed) in enumerate(COUETTE):
        assert middle[i] == pytest.approx(velocity, abs=2e-4)
        at = np.array([time])
        assert -h.stress_curve(1).sample(at)[0] == pytest.approx(moving, rel=2e-4)
        assert h.stress_curve(0).sample(at)[0] == pytest.approx(fixed, abs=2e-4)


def test_a_sudden_start_is_unbounded_with_its_law():
    """mu U / sqrt(pi nu t): Stokes 1851 (from memory); K = U sqrt(rho mu / pi)."""
    said = parts(upper=step.build(0.3), density=870.0, viscosity=0.08, outer=2e-4)["walls"]
    moving = said["upper"]
    assert moving["unbounded"] is True
    assert moving["peak_stress"] is None
    assert moving["peak_stress_error"] is None
    assert moving["peak_force"] is None
    assert moving["peak_time"] == 0.0
    assert moving["unbounded_coefficient"] == pytest.approx(0.3 * np.sqrt(870.0 * 0.08 / np.pi), rel=1e-14)
    assert moving["unbounded_exponent"] == 0.5
    assert moving["final_stress"] == pytest.approx(-0.08 * 0.3 / 2e-4, rel=1e-4)
    assert said["lower"]["unbounded"] is False
    assert said["lower"]["unbounded_coefficient"] is None


def test_the_law_of_the_largest_of_several_jumps():
    drive = trapezoid.build(1.0, 0.0, 0.5, 0.0, from_=0.4, at=0.2)  # jumps of 0.4 at once, 0.6 up, 0.6 down
    more = problem(upper=drive, lower=step.build(-0.9, at=0.3), duration=1.0)
    said = solve(more).parts["walls"]
    assert said["upper"]["unbounded_coefficient"] == pytest.approx(0.6 / np.sqrt(np.pi), rel=1e-12)
    assert said["upper"]["peak_time"] == 0.2
    assert said["lower"]["unbounded_coefficient"] == pytest.approx(0.9 / np.sqrt(np.pi), rel=1e-12)
    assert said["lower"]["peak_time"] == 0.3


def test_the_law_in_a_rotating_gap_uses_the_surface_s_speed():
    said = parts(shape="annulus_rotating", upper=2.0)["walls"]["outer"]
    assert said["unbounded_coefficient"] == pytest.approx(2.0 * 1.5 / np.sqrt(np.pi), rel=1e-12)


def test_a_slipping_wall_s_sudden_start_has_a_peak():
    """Just after the jump the liquid still rests: stress = mu U / slip length (limit t -> 0+)."""
    said = parts(upper=1.0, slips=(0.0, 0.1))["walls"]["upper"]
    assert said["unbounded"] is False
    assert said["peak_stress"] == pytest.approx(-10.0, rel=1e-4)
    assert said["peak_time"] == pytest.approx(0.0, abs=1e-6)


# --- start-up under pressure: T to 90, 95, 99, 99.9 % of each quantity; plates on their half width
LEVELS = {"10 %": 0, "5 %": 1, "1 %": 2, "0.1 %": 3}
PIPE = {
    "velocity": (0.41589, 0.53574, 0.81404, 1.21219),
    "flow": (0.39051, 0.51037, 0.78867, 1.18682),
    "stress": (0.33441, 0.45426, 0.73256, 1.13071),
}
PLATES = {
    "velocity": (0.94599, 1.22691, 1.87919, 2.81239),
    "flow": (0.92730, 1.20822, 1.86050, 2.79370),
    "stress": (0.84809, 1.12901, 1.78129, 2.71449),
}


@pytest.mark.parametrize(("shape", "table", "unit"), [("pipe", PIPE, 1.0), ("plates", PLATES, 0.25)])
def test_start_up_times_under_a_sudden_pressure(shape, table, unit):
    said = parts(shape=shape, push=1.0)["settling"]
    wall = "bore" if shape == "pipe" else "upper"
    for label, column in LEVELS.items():
        found = said["levels"][label]
        for name in ("velocity", "flow"):
            assert found[name] == pytest.approx(table[name][column] * unit, rel=1e-4, abs=1e-5 * unit)
        assert found["stress"][wall] == pytest.approx(table["stress"][column] * unit, rel=1e-4, abs=1e-5 * unit)
    assert said["time"] == said["velocity"] == said["levels"]["1 %"]["velocity"]
    assert said["reached"] is True
    within(said["time"], said["error"], table["velocity"][2] * unit, 1e-4)


def test_settling_of_plane_couette_stresses():
    """Both wall stresses within 1 % at T = 0.5368: 2 exp(-pi^2 T) = 0.01 to the digits given."""
    said = parts(upper=ramp.build(1.0, 1e-7))["settling"]
    for wall in ("lower", "upper"):
        assert said["stress"][wall] == pytest.approx(np.log(200.0) / np.pi**2, rel=1e-4)
    assert said["errors"]["stress"]["lower"] < 1e-4


# --- peaks
def test_the_peak_of_a_ramp_lies_at_its_end_and_is_signed():
    """At its end 1 + (1/3 - 2 sum exp(-n^2 pi^2 T)/(n pi)^2)/T for a ramp over T.

    The sudden start's stress (Christov 2013) integrated over the ramp.
    """
    n, over = np.arange(1, 2000), 0.05
    eigen = (n * np.pi) ** 2
    top = 1.0 + (1.0 / 3.0 - 2.0 * (np.exp(-eigen * over) / eigen).sum()) / over
    for sign in (1.0, -1.0):
        said = parts(upper=ramp.build(sign, over))["walls"]["upper"]
        within(said["peak_stress"], said["peak_stress_error"], -sign * top, 1e-4)
        assert said["peak_time"] == pytest.approx(over, abs=1e-4 * over + said["peak_time_error"])
        assert said["overshoot"] == pytest.approx(top - 1.0, abs=3e-4)
        assert said["peak_shear_rate"] == pytest.approx(top, rel=1e-4)
        assert said["final_stress"] == pytest.approx(-sign, rel=1e-4)
        assert said["final_speed"] == sign
        pair = said["smallest_stress"], said["largest_stress"]
        assert pair[0 if sign > 0 else 1] == said["peak_stress"]
        assert pair[1 if sign > 0 else 0] == pytest.approx(0.0, abs=1e-6)


def test_a_plateau_s_peak_time_is_the_first_within_its_error():
    """The fixed wall's stress rises to its final value and never exceeds it: not the run's end is its peak's time."""
    solved = solve(problem(upper=1.0, duration=30.0, accuracy=1e-4))
    said, curve = solved.parts["walls"]["lower"], solved.run.history.stress_curve(0)
    assert said["peak_stress"] == pytest.approx(1.0, rel=1e-4)
    floor = said["peak_stress"] - said["peak_stress_error"]
    assert curve.sample(np.array([said["peak_time"]]))[0] == pytest.approx(floor, abs=1e-12)
    before = np.linspace(0.0, said["peak_time"] * (1.0 - 1e-9), 5000)
    assert (curve.sample(before) < floor).all()
    assert np.log(2.0 / 1e-4) / np.pi**2 < said["peak_time"] < 4.0  # 2 exp(-pi^2 T): later than 1e-4, far from 30


def test_forces_and_torques_are_those_of_all_gaps():
    flat = parts(upper=ramp.build(1.0, 0.2), areas=(2.0, 3.0), count=4, section=0.5)
    upper, lower = flat["walls"]["upper"], flat["walls"]["lower"]
    assert upper["peak_force"] == pytest.approx(12.0 * upper["peak_stress"], rel=1e-14)
    assert lower["peak_force"] == pytest.approx(8.0 * lower["peak_stress"], rel=1e-14)
    assert upper["peak_torque"] is None
    assert flat["flow"]["final_flow_rate"] == pytest.approx(2.0 * flat["flow"]["final_mean_velocity"], rel=1e-14)
    ring = parts(shape="annulus_rotating", upper=ramp.build(1.0, 0.2), areas=(2.0, 3.0), count=4)["walls"]["outer"]
    assert ring["peak_torque"] == pytest.approx(4 * 3.0 * 1.5 * ring["peak_stress"], rel=1e-14)
    assert ring["peak_force"] is None
    assert parts(upper=ramp.build(1.0, 0.2))["walls"]["upper"]["peak_force"] is None


# --- flow and travel
def test_volume_delivered_by_a_sudden_pressure_in_a_pipe():
    """V = Q (t - 32 sum (1 - exp(-l^2 t))/l^6): Szymanski 1932 integrated; Q = pi/8 (Hagen-Poiseuille)."""
    root = jn_zeros(0, 200)
    until = 1.5
    left = np.exp(-(root**2) * until)
    volume = np.pi / 8.0 * (until - 32.0 * ((1.0 - left) / root**6).sum())
    rate = np.pi / 8.0 * (1.0 - 32.0 * (left / root**4).sum())
    said = parts(shape="pipe", push=1.0, duration=until, section=np.pi)["flow"]
    assert said["volume_delivered"] == pytest.approx(volume, rel=1e-4)
    assert said["mean_travel"] == pytest.approx(volume / np.pi, rel=1e-4)
    assert said["final_flow_rate"] == pytest.approx(rate, rel=1e-4)
    assert said["peak_mean_velocity"] == said["final_mean_velocity"]


def test_travel_of_walls_and_of_the_liquid_beside_them():
    solved = solve(problem(upper=trapezoid.build(2.0, 0.1, 0.2, 0.3), lower=-0.5, duration=1.0))
    said = solved.parts["walls"]
    assert said["upper"]["travel"] == pytest.approx(2.0 * (0.05 + 0.2 + 0.15), rel=1e-12)
    assert said["lower"]["travel"] == pytest.approx(-0.5, rel=1e-12)
    ends = solved.run.history.travel[-1, [0, -1]]
    np.testing.assert_allclose(ends, [-0.5, 0.8], rtol=1e-12)


def test_layers_of_two_walls_meet():
    """Two walls started together: 98 % of the gap are covered when erfc(0.49/(2 sqrt t)) + erfc(0.51/(2 sqrt t)) = 0.01
    (Stokes' first problem from both sides); to the spacing of the nodes in mid-gap."""
    true = brentq(lambda t: erfc(0.245 / np.sqrt(t)) + erfc(0.255 / np.sqrt(t)) - 0.01, 1e-3, 0.1)
    said = parts(accuracy=1e-4, upper=1.0, lower=1.0)["motion"]
    assert said["depth_share"] == 0.01
    assert said["layers_meet"] == pytest.approx(true, rel=0.05)


def test_one_wall_s_layer_crosses_the_gap_and_meets_nothing_before():
    said = parts(accuracy=1e-3, upper=1.0, duration=0.02)["motion"]
    assert said["layers_meet"] is None
    assert said["deepest"]["upper"] == pytest.approx(3.6427726 * np.sqrt(0.02), rel=0.02)


# --- settling by definition
def test_back_to_rest_is_measured_against_the_run_s_largest():
    """After a trapezoid the slowest mode decays: velocity within 1 % of the run's largest, which is the wall's."""
    solved = solve(problem(upper=trapezoid.build(1.0, 0.1, 0.2, 0.3), accuracy=1e-4))
    h, said = solved.run.history, solved.parts["settling"]
    assert solved.run.regime.velocity == 0.0
    levels = [said["levels"][label]["velocity"] for label in ("1 %", "0.1 %")]
    assert levels[1] - levels[0] == pytest.approx(np.log(10.0) / np.pi**2, rel=1e-3)
    at = h.profiles_at(np.array([said["time"]]))[0]
    assert np.abs(at).max() == pytest.approx(0.01, rel=2e-3)
    peak = abs(h.stress_curve(1).magnitude()[0])
    assert abs(h.stress_curve(1).sample(np.array([said["stress"]["upper"]]))[0]) == pytest.approx(0.01 * peak, rel=1e-3)


def test_a_pressure_pulse_is_measured_against_the_largest_between_nodes():
    """The largest velocity lies in mid-gap between the walls of an annulus, not at a node."""
    pulse = trapezoid.build(1.0, 0.1, 0.5, 0.1)
    coarse, fine = (parts(accuracy=a, shape="annulus_axial", push=pulse)["settling"] for a in (1e-2, 1e-4))
    assert abs(coarse["time"] - fine["time"]) < 1e-2 * fine["time"]


def test_start_from_steady_with_nothing_happening_has_settled_at_once():
    said = parts(upper=0.7, push=1.0, start="steady")
    for name in ("time", "velocity", "flow", "error"):
        assert said["settling"][name] == 0.0
    assert said["settling"]["stress"] == {"lower": 0.0, "upper": 0.0}
    wall = said["walls"]["upper"]
    assert wall["peak_stress"] == pytest.approx(wall["final_stress"], rel=1e-13)
    assert said["walls"]["upper"]["overshoot"] == pytest.approx(0.0, abs=1e-12)


def test_a_run_that_ends_before_settling_says_so():
    said = parts(upper=1.0, duration=0.1)["settling"]
    assert said["reached"] is False
    assert said["time"] is None
    assert said["error"] is None
    assert said["stress"] == {"lower": None, "upper": None}
    assert said["levels"]["10 %"]["velocity"] is None


def test_the_steady_state_is_that_of_the_drive_even_where_the_run_ends_earlier():
    """A ramp cut off half way: 1 % of the eventual speed is never reached."""
    said = parts(upper=ramp.build(1.0, 2.0), duration=1.0)["settling"]
    assert said["reached"] is False
    assert said["regime"] == "steady"


def test_a_drive_that_ends_in_nothing_never_settles():
    rising = ramp.build(1.0, 5.0)
    endless = Drive(rising.tracks, 0.0, Eventual(None))
    said = parts(accuracy=1e-3, upper=endless, duration=1.0)["settling"]
    assert said["reached"] is False
    assert said["regime"] == "none"
    assert said["time"] is None
    assert said["levels"]["10 %"]["stress"] == {"lower": None, "upper": None}
    with pytest.raises(SolveError, match="a duration is needed"):
        solve(problem(upper=endless))


def test_a_null_level_is_not_a_zero_one():
    """A wall's stress with an infinite peak and a steady value of zero has no settling time."""
    said = parts(accuracy=1e-3, upper=trapezoid.build(1.0, 0.0, 0.3, 0.0))["settling"]
    assert said["stress"]["upper"] is None
    assert said["stress"]["lower"] is not None
    assert said["reached"] is True


# --- periodic drives
def test_periodic_amplitudes_of_an_oscillating_plate():
    """sinh(k y)/sinh(k), k = sqrt(i w): stress amplitudes |k coth k| on the moving wall, |k / sinh k| on the fixed.

    Landau & Lifshitz, Fluid Mechanics, section 24 (from memory).
    """
    period = 0.7
    k = np.sqrt(2j * np.pi / period)
    solved = solve(problem(upper=sine.build(1.0, period=period), accuracy=1e-3), "refinement")
    regime = solved.run.regime
    assert regime.kind == "periodic"
    assert regime.period == period
    assert regime.stress[1] == pytest.approx(abs(k / np.tanh(k)), rel=1e-3)
    assert regime.stress[0] == pytest.approx(abs(k / np.sinh(k)), rel=1e-3)
    assert regime.mean == pytest.approx(abs((np.cosh(k) - 1.0) / (k * np.sinh(k))), rel=1e-3)
    assert regime.velocity == pytest.approx(1.0, rel=1e-4)


def test_settling_into_the_periodic_state_of_a_plate():
    """What is left of the start decays in the eigenfunctions sin(n pi y), each by its own exp(-n^2 pi^2 t).

    Its amplitudes are those of minus the periodic state at t = 0, here by quadrature.
    """
    omega = 2.0 * np.pi / 0.7
    k = np.sqrt(1j * omega)
    y = np.linspace(0.0, 1.0, 4001)
    state = np.imag(np.sinh(k * y) / np.sinh(k))
    n = np.arange(1, 60)
    shape = np.sin(np.pi * np.outer(n, y))
    amplitude = -2.0 * np.trapezoid(shape * state, y, axis=1)

    def left(t):
        return np.abs((amplitude * np.exp(-((n * np.pi) ** 2) * t)) @ shape).max()

    true = brentq(lambda t: left(t) - 0.01, 0.01, 3.0)
    said = parts(accuracy=1e-3, judge="refinement", upper=sine.build(1.0, period=0.7))["settling"]
    assert said["regime"] == "periodic"
    within(said["time"], said["error"], true, 1e-3)


def test_a_drive_that_is_periodic_from_steady_on_may_never_be_away_from_it():
    """A sine about a mean, from steady: only the oscillation is new."""
    said = parts(accuracy=1e-3, judge="refinement", upper=sine.build(1e-5, period=0.5, mean=1.0), start="steady")
    assert said["settling"]["time"] == 0.0
    assert said["settling"]["reached"] is True


@pytest.mark.parametrize("shape", SHAPES)
def test_a_lag_settles_with_the_slower_of_drive_and_fluid(shape):
    """Late in a slow lag the flow follows it: two levels lie T ln 10 apart."""
    said = parts(shape=shape, upper=lag.build(1.0, 2.0))["settling"]["levels"]
    assert said["0.1 %"]["flow"] - said["1 %"]["flow"] == pytest.approx(2.0 * np.log(10.0), rel=1e-3)


def test_pressure_numbers_are_the_drive_s_own():
    said = parts(push=trapezoid.build(-3.0, 0.1, 0.2, 0.1, from_=1.0), upper=constant(0.2))["pressure"]
    assert said["peak_drop_per_length"] == -3.0
    assert said["peak_time"] == pytest.approx(0.1, rel=1e-12)
    assert said["final_drop_per_length"] == 1.0


def test_a_pressure_s_peak_is_found_between_the_steps():
    """Steps of a thirtieth of a period and more: the largest of them would miss the crest by percents."""
    said = parts(accuracy=1e-3, push=sine.build(2.0, period=1.0, mean=0.3))["pressure"]
    assert said["peak_drop_per_length"] == pytest.approx(2.3, rel=1e-3)
    assert said["peak_time"] % 1.0 == pytest.approx(0.25, abs=0.01)
