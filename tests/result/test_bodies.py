"""Headline numbers of bodies and of prescribed flow against closed forms and an independent integration."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest
from carried import carried
from chebyshev import differentiation
from problems import ramp, step, trapezoid
from scipy.integrate import solve_ivp

from transient.answer import run, solve
from transient.case.read import read_case
from transient.gap.system import assemble
from transient.march.coupled import dense, operator, slowest

# A thin oil film under a carriage: C = density area height / mass = 2e-5
FILM = {"outer": 5e-5, "density": 870.0, "viscosity": 0.04}
AREA, MASS = 0.02, 43.5
HOLD = FILM["viscosity"] * AREA / FILM["outer"]  # N s/m


def headlines(accuracy=1e-4, **case):
    return solve(carried(accuracy=accuracy, **case), "refinement").parts


def body(accuracy=1e-4, end="upper", **case):
    return headlines(accuracy, **case)["bodies"][end]


def test_a_block_slides_down_an_inclined_film(tmp_path):
    """V = m g sin(theta) h/(mu A), time constant m h/(mu A): massless-film limit; textbook exercise, from memory."""
    file = tmp_path / "slide.toml"
    file.write_text(
        """title = "Block on a wet slope"
[gap]
shape = "plates"
height = "0.05 mm"
length = "200 mm"
width = "100 mm"
[fluid]
density = "870 kg/m^3"
viscosity = "40 mPa*s"
[wall.upper.body]
mass = "43.5 kg"
incline = "2 deg"
[run]
accuracy = "0.01 %"
"""
    )
    case = read_case(file)
    said = solve(case.problem(), "refinement").parts["bodies"]["upper"]
    speed = MASS * 9.80665 * math.sin(math.radians(2.0)) / HOLD
    assert said["terminal_speed"] == pytest.approx(speed, rel=1e-10)
    # 1 % is left after ln(100) time constants; the film's own inertia adds a third of its mass
    constant = (MASS + FILM["density"] * AREA * FILM["outer"] / 3.0) / HOLD
    assert said["speed_settling_time"] == pytest.approx(constant * math.log(100.0), rel=1e-4)
    assert said["peak_drive_load"] == pytest.approx(MASS * 9.80665 * math.sin(math.radians(2.0)), rel=1e-14)
    assert said["coast_down"] is None


# x tan x = C, C = density height area / mass: Essentials of Applied Mathematics for Scientists and Engineers, Table A.1
TANGENT = {
    0.01: (0.0998, 3.1448, 6.2848, 9.4258),
    0.1: (0.3111, 3.1731, 6.2991, 9.4354),
    1.0: (0.8603, 3.4256, 6.4373, 9.5293),
    10.0: (1.4289, 4.3058, 7.2281, 10.2003),
}


@pytest.mark.parametrize("c", TANGENT)
def test_the_solver_s_decay_rates_are_those_of_a_block_on_a_film(c):
    case = carried(upper={"mass": 1.0 / c})
    found = []
    for cells in (60, 120):
        system = dense(case, assemble(case, cells, (1.0, 1.0)))
        rates = np.sort(-np.linalg.eigvals(operator(system)).real)[:4]
        assert slowest(system) == pytest.approx(1.0 / rates[0], rel=1e-9)
        found.append(rates)
    roots = np.sqrt(found[1] + (found[1] - found[0]) / 3.0)
    assert roots == pytest.approx(TANGENT[c], abs=1.5e-4)  # the table's fourth decimal, and what extrapolation leaves
    assert roots[0] == pytest.approx(TANGENT[c][0], abs=5.1e-5)


def test_a_rotor_s_terminal_speed_is_that_of_concentric_cylinders():
    """Torque 4 pi mu R1^2 R2^2 dOmega/(R2^2 - R1^2) per length (from memory; e.g. Bird, Stewart & Lightfoot 3.6)."""
    inner, outer, length, mu = 0.5, 1.5, 2.0, 1.0
    torque = 3.0
    said = body(
        end="inner", shape="annulus_rotating",
        lower={"mass": 4.0, "load": torque, "area": 2.0 * math.pi * inner * length},
    )  # fmt: skip
    hold = 4.0 * math.pi * mu * inner**2 * outer**2 * length / (outer**2 - inner**2)
    assert said["terminal_speed"] == pytest.approx(torque / hold, rel=1e-11)
    assert said["peak_film_load"] == pytest.approx(-torque, rel=2e-3)


def test_the_worked_viscometer():
    """R = 0.06 m, gap 1.5 mm, L = 0.4 m, 300 rpm, 1.8 N m: 0.158 Pa s by the thin-gap formula (Cengel & Cimbala,
    viscosity chapter, from memory).  With that viscosity the film of the unrolled gap runs at 300 rpm."""
    radius, gap, length, torque = 0.06, 1.5e-3, 0.4, 1.8
    load = {"mass": 0.5, "load": torque / radius, "area": 2.0 * math.pi * radius * length}
    flat = body(upper=load, outer=gap, viscosity=0.158, density=900.0)
    assert flat["terminal_speed"] / radius == pytest.approx(300 * 2 * math.pi / 60, rel=0.003)  # three digits
    turning = {"mass": 0.5 * radius**2, "load": torque, "area": 2.0 * math.pi * radius * length}
    round_ = body(
        end="inner", shape="annulus_rotating", lower=turning, inner=radius, outer=radius + gap, viscosity=0.158,
        density=900.0,
    )  # fmt: skip
    # what the thin-gap formula leaves out: 2 R2^2 / (R1 (R1 + R2)), from the concentric cylinders' torque
    thick = 2.0 * (radius + gap) ** 2 / (radius * (2.0 * radius + gap))
    assert round_["terminal_speed"] == pytest.approx(flat["terminal_speed"] / radius / thick, rel=1e-9)


def test_a_sprung_plate_on_a_thin_film_is_a_damped_oscillator():
    """x = x0 e^(-d t) (cos w t + d/w sin w t), d = mu A/(2 h m), w^2 = k/m - d^2: free vibration, textbooks."""
    stiffness = 40.0
    case = carried(
        upper={"mass": MASS, "stiffness": stiffness, "initial_displacement": 0.01, "area": AREA},
        duration=30.0, accuracy=1e-4, **FILM,
    )  # fmt: skip
    solved = solve(case, "refinement")
    mass = MASS + FILM["density"] * AREA * FILM["outer"] / 3.0
    d = HOLD / (2.0 * mass)
    w = math.sqrt(stiffness / mass - d * d)
    t = solved.run.history.time
    true = 0.01 * np.exp(-d * t) * (np.cos(w * t) + d / w * np.sin(w * t))
    place = solved.run.history.place[:, 1]
    assert np.abs(place - true).max() <= 1e-4 * 0.01
    said = solved.parts["bodies"]["upper"]
    assert said["final_position"] == pytest.approx(true[-1], abs=1e-6)
    assert said["terminal_speed"] == 0.0
    assert said["peak_speed"] < 0.0


def test_a_coast_down_takes_its_time_and_distance():
    """U = U0 e^(-t/T), T = m h/(mu A): 1 % is left after T ln 100, over 0.99 U0 T (massless film)."""
    drive = trapezoid.build(12.0, 0.05, 1.0, 0.05)
    said = body(upper={"mass": MASS, "load": drive, "area": AREA}, **FILM)["coast_down"]
    constant = MASS / HOLD
    assert said["begins"] == 1.1
    assert said["time"] == pytest.approx(constant * math.log(100.0), rel=1e-4)
    assert said["distance"] == pytest.approx(0.99 * said["speed"] * constant, rel=1e-4)
    assert said["time_error"] <= 1e-3 * said["time"]
    assert said["distance_error"] <= 1e-3 * said["distance"]


def test_a_plate_thrown_over_deep_fluid_comes_to_rest_where_momentum_says():
    """All momentum goes into the wall at rest: mu A x/h = m U0, however the fluid moves meanwhile."""
    parts = headlines(accuracy=1e-3, upper={"mass": 0.2, "initial_speed": 0.5}, duration=40.0)
    said = parts["bodies"]["upper"]
    assert abs(said["final_position"] - 0.1) <= said["final_position_error"] + 1e-9
    assert said["final_position_error"] <= 1e-3 * 0.1
    assert said["peak_acceleration"] is None
    assert said["peak_film_load"] is None
    assert said["film_load_unbounded"] is True
    assert parts["walls"]["upper"]["unbounded"] is True
    assert said["coast_down"]["begins"] == 0.0


def test_dry_friction_stops_a_carriage():
    """m U' = -f - c U from U0: stands after m/c ln(1 + c U0/f) (integrated by hand; massless film)."""
    drive = trapezoid.build(12.0, 0.05, 1.0, 0.05)
    given = {"mass": MASS, "load": drive, "sliding": 2.0, "breakaway": 3.0, "area": AREA}
    said = body(1e-3, upper=given, duration=10.0, **FILM)
    left = said["coast_down"]
    ((early, started), (begin, end)) = said["standstills"]
    assert early == 0.0
    assert started == pytest.approx(0.05 * 3.0 / 12.0, rel=1e-3)
    stop = MASS / HOLD * math.log(1.0 + HOLD * left["speed"] / 2.0)
    assert begin - left["begins"] == pytest.approx(stop, rel=1e-3)
    assert end is None
    assert said["final_speed"] == 0.0


def test_standing_until_the_load_exceeds_the_breakaway_value():
    given = {"mass": MASS, "load": ramp.build(6.0, 2.0), "sliding": 2.0, "breakaway": 3.0, "area": AREA}
    ((begin, end),) = body(1e-3, upper=given, duration=4.0, **FILM)["standstills"]
    assert begin == 0.0
    assert end == pytest.approx(1.0, rel=1e-4)  # 3 N of 6 N in 2 s


class Lines:
    """Fluid on Chebyshev points under a body with a force-speed curve, for SciPy's Radau; height, density 1."""

    def __init__(self, mass, curve, area=1.0, n=40):
        _, first = differentiation(n)
        self.first = 2.0 * first  # points from y = 1 to y = 0
        self.operator = self.first @ self.first
        self.mass, self.curve, self.area = mass, curve, area

    def rate(self, t, state):
        """State: fluid inside, then the body's speed."""
        velocity = np.concatenate([state[-1:], state[:-1], [0.0]])
        pull = -self.area * (self.first[0] @ velocity)
        force = np.interp(state[-1], *self.curve) + pull
        return np.append((self.operator @ velocity)[1:-1], force / self.mass)

    def stress(self, state):
        return -self.first[0] @ np.concatenate([state[-1:], state[:-1], [0.0]])


def test_a_force_speed_curve_against_an_independent_integration():
    """Fluid and body weigh the same; the curve is falling, so its corners bend the run-up."""
    curve = ((0.0, 0.3, 0.8, 1.2), (1.0, 1.4, 0.9, 0.0))
    lines = Lines(1.0, curve)
    times = np.array([0.05, 0.2, 0.5, 1.0, 2.0])
    found = solve_ivp(lines.rate, (0.0, 2.0), np.zeros(40), "Radau", times, rtol=1e-10, atol=1e-12)
    solved = solve(carried(upper={"mass": 1.0, "curve": curve}, duration=2.0, accuracy=1e-3), "refinement")
    history, errors = solved.run.history, solved.run.errors
    speed = history.speed_curve(1).sample(times)
    stress = history.stress_curve(1).sample(times)
    near = np.searchsorted(history.time, times)
    assert np.all(np.abs(speed - found.y[-1]) <= errors.more["speed"][:, 1].max() + 1e-9)
    true = np.array([lines.stress(state) for state in found.y.T])
    assert np.all(np.abs(stress - true) <= 1e-3 * np.abs(true))
    said = solved.parts["bodies"]["upper"]
    assert len(near) == 5
    assert said["peak_drive_load"] == pytest.approx(1.4, rel=1e-12)  # at the corner, whatever the rows
    crossing = solve_ivp(
        lines.rate, (0.0, 2.0), np.zeros(40), "Radau", rtol=1e-10, atol=1e-12, events=lambda t, y: y[-1] - 0.3
    )
    assert said["peak_drive_load_time"] == pytest.approx(crossing.t_events[0][0], rel=2e-3)


# --- prescribed flow: the pressure is the answer


def test_the_pressure_of_a_slowly_rising_flow_in_a_pipe():
    """G = 8 mu V/R^2 + (4/3) rho dV/dt while the flow rises slowly: Hagen-Poiseuille, and the momentum factor 4/3
    of the parabolic profile (White, Viscous Fluid Flow; from memory)."""
    said = headlines(1e-4, shape="pipe", flow=ramp.build(2.0, 10.0))["pressure"]
    assert said["unbounded"] is False
    assert said["peak_drop_per_length"] == pytest.approx(8.0 * 2.0 + 4.0 / 3.0 * 0.2, rel=1e-4)
    assert said["peak_time"] == pytest.approx(10.0, rel=1e-6)
    assert said["final_drop_per_length"] == pytest.approx(16.0, rel=1e-4)
    assert abs(said["peak_drop_per_length"] - (16.0 + 0.8 / 3.0)) <= said["peak_drop_per_length_error"] + 1e-6
    assert said["final_drop_per_length_error"] <= 1e-3 * 16.0


def test_no_net_flow_takes_three_times_the_drag():
    """P = h^2 G/(2 mu U) = -3 for zero net flow (plane Couette-Poiseuille flow; exact algebra)."""
    said = headlines(1e-4, flow=0.0, upper=ramp.build(0.5, 0.3))["pressure"]
    assert said["final_drop_per_length"] == pytest.approx(-6.0 * 0.5, rel=1e-4)
    assert said["unbounded"] is False


def test_a_sudden_flow_has_no_pressure_peak():
    said = headlines(1e-3, duration=1.0, flow=step.build(1.0, at=0.2))["pressure"]
    assert said["unbounded"] is True
    assert said["peak_drop_per_length"] is None
    assert said["peak_drop_per_length_error"] is None
    assert said["peak_time"] == 0.2
    assert said["final_drop_per_length"] != 0.0


def test_a_prescribed_pressure_keeps_its_own_numbers():
    assert headlines(1e-3, push=ramp.build(-3.0, 1.0))["pressure"] == {
        "peak_drop_per_length": -3.0, "peak_time": 1.0, "final_drop_per_length": -3.0,
    }  # fmt: skip


def test_every_number_is_finite_or_null():
    parts = headlines(1e-2, upper={"mass": 0.2, "initial_speed": 0.5}, duration=1.0)
    json.dumps(parts, allow_nan=False)


CARRIAGE = """title = "Carriage"
[gap]
shape = "plates"
height = "1 mm"
[fluid]
density = "870 kg/m^3"
viscosity = "40 mPa*s"
[wall.upper.body]
mass = "2 kg"
area = "200 cm^2"
force = { kind = "step", to = "3 N", at = "0.2 s" }
force_curve = { speeds = ["0 m/s", "5 m/s"], values = ["4 N", "0 N"] }
[run]
duration = "1 s"
"""


def test_what_moves_the_walls_is_stored(tmp_path):
    file = tmp_path / "carriage.toml"
    file.write_text(CARRIAGE)
    result = run(read_case(file), "refinement")
    units = {name: variable.units for name, variable in result.variables.items()}
    assert units["wall_position"] == "m"
    assert units["wall_acceleration"] == "m/s^2"
    assert units["drive_load"] == units["wall_force"] == "N"  # the fixed wall faces the body's area
    t, upper = result.time, 1
    speed, acceleration = result.wall_speed[:, upper], result.wall_acceleration[:, upper]
    load, film = result.drive_load[:, upper], result.wall_force[:, upper]
    assert load == pytest.approx(np.where(t < 0.2, 0.0, 3.0) + 4.0 - 0.8 * speed, abs=1e-9)
    # Newton's second law row by row
    assert 2.0 * acceleration == pytest.approx(load + film, abs=2e-3 * 7.0)
    # straight lines between the rows: their integrals are the next quantity
    for rate, value in ((acceleration, speed), (speed, result.wall_position[:, upper])):
        gained = np.concatenate([[0.0], np.cumsum(0.5 * np.diff(t) * (rate[1:] + rate[:-1]))])
        assert value - value[0] == pytest.approx(gained, abs=1e-3 * np.abs(value).max())
    # the load's jump, and with it the acceleration's, is two neighbouring rows
    (jump,) = np.flatnonzero(np.diff(acceleration) > 0.5)
    assert t[jump + 1] == 0.2
    assert t[jump + 1] - t[jump] < 1e-12
    assert result.summary["energy"]["bodies"]["upper"]["drive_work"] > 0.0
    assert set(result.summary["quasi_steady"]["bodies"]["upper"]) == {"massless_film", "film_inertia"}
