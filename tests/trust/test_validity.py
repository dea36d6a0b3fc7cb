"""Validity limits against their published values, and the verdict that they lead to."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest
import scipy.linalg
from closed_histories import problem, sine_drive
from scipy.optimize import minimize_scalar

from transient.drive.pieces import constant
from transient.result.history import History
from transient.trust.check import Check, judge, verdict
from transient.trust.quasi_steady import quasi_steady_mean, quasi_steady_stress, steady_profile
from transient.trust.validity import VALIDITY, validity_checks
from transient.trust.validity.entrance import channel_entrance, pipe_entrance
from transient.trust.validity.heating import temperature_rise
from transient.trust.validity.taylor import critical_taylor

WATER = {"density": 1000.0, "viscosity": 1e-3, "start": "steady"}  # nu = 1e-6 m^2/s


def steady_history(case, speeds=(0.0, 0.0), gradient=0.0, end=1.0, **changes) -> History:
    """Two rows and one profile of steady flow (what a validity check looks at); ``changes`` replace fields."""
    time = np.array([0.0, end])
    speed, push = np.tile(np.array(speeds, dtype=float), (2, 1)), np.full(2, float(gradient))
    position = np.linspace(case.inner, case.outer, 33)
    profile = steady_profile(case, np.array(speeds, dtype=float), gradient, position)[None]
    history = History(
        time, np.zeros(2, int), time, quasi_steady_stress(case, speed, push), np.zeros((2, 2)), speed,
        np.zeros((2, 2)), quasi_steady_mean(case, speed, push), np.zeros(2), push, 0 * push, 0 * speed, position,
        np.zeros(1, int), profile, 0 * profile, 0 * profile,
    )  # fmt: skip
    return replace(history, **changes)


def find(case, history, name) -> Check | None:
    return next((check for check in validity_checks(case, history) if check.name == name), None)


def pressed(case, mean):
    """(case, history) with the pressure drop that gives the mean velocity."""
    gradient = mean / quasi_steady_mean(case, [[0.0, 0.0]], [1.0])[0]
    case = replace(case, gradient=constant(gradient))
    return case, steady_history(case, gradient=gradient)


# (shape, mean velocity at the limit for nu = 1e-6): Avila et al. 2011 (2040 on the diameter); Carlson et al. 1982
# (1000 on centreline velocity and half height = 4/3 x 1000 on mean velocity and height, from memory); annulus: the
# pipe's on the hydraulic diameter (common practice, no source).
PRESSURE_LIMITS = [
    (problem(1, 0.0, 5e-3, kinds=("axis", "moving"), **WATER), 0.204),
    (problem(0, 0.0, 1e-3, **WATER), 1.3333333),
    (problem(1, 4e-3, 5e-3, **WATER), 1.02),
]


@pytest.mark.parametrize(("case", "limit"), PRESSURE_LIMITS)
def test_pressure_driven_reynolds(case, limit):
    for share, status in ((0.5, "pass"), (0.79, "pass"), (0.9, "caution"), (1.01, "fail"), (-1.01, "fail")):
        check = find(*pressed(case, share * limit), "Reynolds number, pressure-driven")
        assert check.status == status
        assert check.value == pytest.approx(abs(share) * check.limit, rel=1e-6)
        assert check.source


@pytest.mark.parametrize("speeds", [(0.0, 1.0), (1.0, 0.0), (-0.5, 0.5), (1.0, 2.0)])
def test_wall_driven_reynolds(speeds):
    # Plane Couette flow: 325 on half gap and half difference (Dauchot & Daviaud 1995, from memory): 1300 on the whole.
    case = problem(0, 0.0, 1e-3, **WATER)
    for factor, status in ((1.0, "pass"), (1.1, "caution"), (1.31, "fail")):
        check = find(case, steady_history(case, np.array(speeds) * factor), "Reynolds number, wall-driven")
        assert check.status == status
        assert check.value == pytest.approx(1000 * factor)


def test_fluid_left_behind_counts_as_a_difference():
    case = problem(0, 0.0, 1e-3, **WATER)
    history = steady_history(case, (2.0, 2.0), mean=np.array([0.0, 2.0]))
    assert find(case, history, "Reynolds number, wall-driven").status == "fail"


def test_walls_and_pressure_together_are_on_the_safe_side():
    # Each at 0.6 of its limit is fine alone, but not together.
    case, history = pressed(problem(0, 0.0, 1e-3, **WATER), 0.8)
    both = replace(history, speed=np.tile([-0.39, 0.39], (2, 1)))
    found = {check.name: check.status for check in validity_checks(case, both) if "Reynolds" in check.name}
    assert found == {
        "Reynolds number, wall-driven": "pass",
        "Reynolds number, pressure-driven": "pass",
        "Reynolds number, walls and pressure together": "fail",
    }


def test_a_film_counts_as_half_of_a_symmetric_gap():
    case, history = pressed(problem(0, 0.0, 1e-3, kinds=("moving", "shear_free"), **WATER), 0.5)
    assert find(case, history, "Reynolds number, pressure-driven").value == pytest.approx(1000.0)


# DiPrima & Swinney 1981, from memory: critical Omega R1 d/nu by radius ratio, outer cylinder at rest.
COUETTE_TAYLOR = [(0.5, 68.19), (0.75, 85.78), (0.9, 131.6), (0.95, 185.0), (0.975, 261.0)]


@pytest.mark.parametrize(("ratio", "reynolds"), COUETTE_TAYLOR)
def test_taylor_number(ratio, reynolds):
    outer = 0.05
    case = problem(3, ratio * outer, outer, **WATER)
    critical = reynolds * 1e-6 / (case.inner * case.gap)
    for share, status in ((0.85, "pass"), (0.95, "caution"), (1.02, "fail"), (-1.02, "fail")):
        check = find(case, steady_history(case, (share * critical, 0.0)), "Taylor number")
        assert check.status == status
        assert check.value == pytest.approx(share**2 * check.limit, rel=1e-6)


def test_taylor_number_of_a_narrow_gap():
    # Omega^2 R1 d^3/nu^2 = 1694.95 for a vanishing gap, outer wall at rest (computed); 1708 is the co-rotating limit.
    assert critical_taylor(0.99999) == pytest.approx(1694.95, rel=1e-4)


def onset(ratio: float, turning: float, n: int = 28) -> float:
    """Critical Omega1 R1 d/nu for Omega2/Omega1 = ``turning``: linear stability to steady rings, Chebyshev points.

    (D D* - k^2)^2 u = 2 k^2 Omega v, (D D* - k^2) v = 2 A u (Chandrasekhar 1961, ch. VII, from memory).
    """
    x = np.cos(np.pi * np.arange(n + 1) / n)
    c = np.hstack([2.0, np.ones(n - 1), 2.0]) * (-1.0) ** np.arange(n + 1)
    d = np.outer(c, 1 / c) / (x[:, None] - x + np.eye(n + 1))
    d = 2.0 * (d - np.diag(d.sum(axis=1)))
    inner = ratio / (1 - ratio)
    r = inner + 0.5 * (1 + x)
    one, none = np.eye(n + 1), np.zeros((n + 1, n + 1))
    operator = d @ d + np.diag(1 / r) @ d - np.diag(r**-2.0)
    a = (turning - ratio**2) / (1 - ratio**2)
    omega = a + inner**2 * (1 - turning) / (1 - ratio**2) / r**2

    def reynolds(k: float) -> float:
        m = operator - k * k * one
        left = np.block([[m @ m, none], [none, m]])
        right = np.block([[none, 2 * k * k * np.diag(omega)], [2 * a * one, none]])
        for row, values in (
            (0, np.r_[one[0], none[0]]), (n, np.r_[one[n], none[0]]), (1, np.r_[d[0], none[0]]),
            (n - 1, np.r_[d[n], none[0]]), (n + 1, np.r_[none[0], one[0]]), (2 * n + 1, np.r_[none[0], one[n]]),
        ):  # fmt: skip
            left[row], right[row] = values, 0.0
        w = scipy.linalg.eigvals(right, left)
        w = w[np.isfinite(w)]
        return 1.0 / w[np.abs(w.imag) < 1e-6 * np.abs(w)].real.max()

    return minimize_scalar(reynolds, bounds=(2.5, 6.0), method="bounded", options={"xatol": 1e-3}).fun * inner


@pytest.mark.parametrize("ratio", [0.3, 0.45, 0.6, 0.82, 0.93])
def test_limit_between_the_table_rows(ratio):
    # An eigenvalue solution of the stability equations; below 0.5 the limit must be on the safe side.
    ours = np.sqrt(critical_taylor(ratio) * ratio / (1 - ratio))
    exact = onset(ratio, 0.0)
    assert ours <= 1.01 * exact
    if ratio > 0.5:
        assert ours == pytest.approx(exact, rel=0.01)


@pytest.mark.parametrize(("ratio", "turning"), [(0.5, -0.1), (0.5, 0.15), (0.75, -0.2), (0.75, 0.3), (0.9, 0.5)])
def test_limit_with_both_cylinders_turning(ratio, turning):
    # Never called fine at the eigenvalue solution's onset, nor far outside at half of it.
    case = problem(3, ratio * 0.05, 0.05, **WATER)
    speed = onset(ratio, turning) * 1e-6 / (case.inner * case.gap)
    at = find(case, steady_history(case, (speed, turning * speed)), "Taylor number")
    assert at.status != "pass"
    below = find(case, steady_history(case, (0.5 * speed, 0.5 * turning * speed)), "Taylor number")
    assert below.status == "pass"


def test_a_turning_outer_cylinder_is_stable_but_not_when_it_stops():
    # Rayleigh 1917: stable where the angular momentum grows outwards.
    case = problem(3, 0.045, 0.05, **WATER)
    running = steady_history(case, (0.0, 4.0))
    assert find(case, running, "Taylor number").value == 0.0
    profile = running.profile * (running.position < 0.0499)
    stopped = replace(running, speed=np.array([[0.0, 4.0], [0.0, 0.0]]), profile=profile)
    assert find(case, stopped, "Taylor number").status == "fail"


def test_stokes_layer():
    # U sqrt(2 nu/omega)/nu: turbulence from 500 (Vittori & Verzicco 1998), disturbed at 85 (Blondeaux & Vittori 2021).
    period = 0.02
    layer = np.sqrt(2e-6 * period / (2 * np.pi))
    for reynolds, status in ((80.0, "pass"), (90.0, "caution"), (490.0, "caution"), (510.0, "fail")):
        speed = reynolds * 1e-6 / layer
        case = problem(0, 0.0, 1e-2, speeds=(0.0, sine_drive(speed, period)), **WATER)
        history = steady_history(case, speed=np.array([[0.0, speed], [0.0, -speed]]), mean=np.zeros(2))
        check = find(case, history, "Stokes-layer Reynolds number")
        assert check.status == status
        assert check.value == pytest.approx(reynolds)
    thin = problem(0, 0.0, 0.5 * layer, speeds=(0.0, sine_drive(speed, period)), **WATER)
    assert find(thin, steady_history(thin), "Stokes-layer Reynolds number") is None


def test_entrance_length():
    # Durst et al. 2005, from memory; digits evaluated.
    assert pipe_entrance(100.0) == pytest.approx(5.7719, abs=5e-5)
    assert pipe_entrance(1000.0) == pytest.approx(56.7257, abs=5e-5)
    assert pipe_entrance(0.0) == pytest.approx(0.619)
    assert channel_entrance(0.0) == pytest.approx(0.631)
    pipe = problem(1, 0.0, 5e-3, kinds=("axis", "moving"), length=1.0, **WATER)
    case, history = pressed(pipe, 0.1)  # Re 1000, diameter 10 mm
    assert find(case, history, "entrance length").value == pytest.approx(0.567257, abs=1e-6)
    for length, status in ((10.0, "pass"), (1.0, "caution"), (0.5, "fail")):
        assert find(replace(case, length=length), history, "entrance length").status == status
    assert find(replace(case, length=None), history, "entrance length") is None


def test_pressure_wave():
    # Sound at 1000 m/s (common practice, no source) over 100 m takes 0.1 s.
    pipe = problem(1, 0.0, 5e-3, kinds=("axis", "moving"), length=100.0, density=1000.0, viscosity=1.0)
    step = replace(pipe, gradient=constant(1e5, before=0.0))
    history = steady_history(step, gradient=1e5)
    check = find(step, history, "pressure-wave time")
    assert check.value == pytest.approx(0.1 / 0.025)
    assert check.status == "fail"
    assert find(replace(step, length=2.0), history, "pressure-wave time").status == "pass"
    slow = replace(pipe, gradient=sine_drive(1e5, 200.0))
    assert find(slow, replace(history, time=np.array([0.0, 200.0])), "pressure-wave time").value < 0.01
    assert find(replace(pipe, gradient=constant(1e5), start="steady"), history, "pressure-wave time") is None


def test_viscous_heating():
    # Constant viscosity, walls kept cool: mu U^2/(8 k) (Bird, Stewart & Lightfoot, Eq. 9.4-11 at mid gap).
    case = problem(0, 0.0, 2e-4, viscosity=0.2, start="steady")
    history = steady_history(case, (0.0, 3.0), end=100.0)
    assert temperature_rise(case, history)[1] == pytest.approx(0.2 * 9 / (8 * 0.13), rel=1e-9)
    check = find(case, history, "viscous heating")
    assert check.status == "caution"
    # Before heat can leave: tau U t/(rho c h).
    short = steady_history(case, (0.0, 3.0), end=1e-5)
    expected = 0.2 * 3 / 2e-4 * 3 * 1e-5 / (case.density * 1900 * 2e-4)
    assert find(case, short, "viscous heating").value == pytest.approx(expected, rel=1e-9)
    assert find(case, short, "viscous heating").status == "pass"
    # The power of the pressure in a pipe is G V per volume.
    pipe = problem(1, 0.0, 1e-3, kinds=("axis", "moving"), start="steady", gradient=1e6)
    flowing = steady_history(pipe, gradient=1e6)
    expected = 1e6 * flowing.mean[0] / (pipe.density * 1900)
    assert temperature_rise(pipe, flowing)[0] == pytest.approx(expected, rel=1e-9)


def test_power_of_every_round_gap_equals_its_dissipation():
    # Steady torque x speed over the volume, by the textbook torque.
    case = problem(3, 0.8, 1.0, start="steady")
    history = steady_history(case, (2.0, -1.0))
    torque = 4 * np.pi * case.viscosity * 0.64 / 0.36 * 3.0
    expected = torque * 3.0 / (np.pi * 0.36) / (case.density * 1900)
    assert temperature_rise(case, history)[0] == pytest.approx(expected, rel=1e-9)


def test_proportions():
    # Common practice, no source.
    history = steady_history(problem())
    for length, status in ((0.02, "pass"), (0.005, "caution"), (0.0005, "fail")):
        assert find(problem(length=length), history, "gap over length").status == status
    for width, status in ((0.025, "pass"), (0.01, "caution"), (0.0015, "fail")):
        assert find(problem(section=1e-3 * width), history, "height over width").status == status
    for gap, status in ((2e-7, "caution"), (5e-9, "fail")):
        case = problem(outer=gap)
        assert find(case, steady_history(case), "very thin gap").status == status
    assert find(problem(), history, "very thin gap") is None


def test_every_check_of_the_registry_can_speak_and_names_its_source():
    seen = {}
    cases = [
        *(pressed(replace(case, length=1.0, section=1e-5), 0.1) for case, _ in PRESSURE_LIMITS),
        (problem(3, 0.04, 0.05), None), (problem(outer=1e-7), None),
        (problem(speeds=(0.0, sine_drive(1.0, 1e-3))), None),
        (problem(speeds=(0.0, 1.0), gradient=constant(1.0, before=0.0), length=1.0), None),
    ]  # fmt: skip
    for case, history in cases:
        history = history or steady_history(case, (0.0, 1.0), gradient=0.0 if case.rotating else 1.0)
        for function in VALIDITY:
            check = function(case, history)
            if check is not None:
                assert check.kind == "validity"
                assert check.source
                assert check.note
                json.dumps(check.as_dict(), allow_nan=False)
                seen[function.__name__] = check.name
    assert set(seen) == {function.__name__ for function in VALIDITY}
    assert len(set(seen.values())) == len(seen)


def test_nothing_moving_passes_everything():
    pipe = problem(1, 0.0, 1e-3, kinds=("axis", "moving"))
    for case in (problem(length=0.1, section=1e-4), pipe, problem(3, 0.04, 0.05)):
        checks = validity_checks(case, steady_history(case))
        assert {check.status for check in checks} <= {"pass"}


def make(kind, status):
    return Check("x", kind, status, 1.0, 2.0, "s", "n")


@pytest.mark.parametrize(
    ("found", "expected"),
    [
        ([], "good"),
        ([("validity", "pass"), ("numerics", "pass")], "good"),
        ([("validity", "caution"), ("numerics", "pass")], "caution"),
        ([("numerics", "caution")], "caution"),
        ([("validity", "fail"), ("numerics", "caution")], "outside"),
        ([("validity", "fail"), ("numerics", "fail")], "failed"),
        ([("validity", "pass"), ("numerics", "fail")], "failed"),
    ],
)
def test_verdict(found, expected):
    # The contract: an answer outside validity is never called good, a failed self-check outranks it.
    assert verdict(make(*pair) for pair in found) == expected


def test_judge():
    assert [judge(v, 0.8, 1.0) for v in (0.8, 0.81, 1.0, 1.01, float("nan"), float("inf"))] == [
        "pass", "caution", "caution", "fail", "fail", "fail",
    ]  # fmt: skip
    assert judge(1e9, 1.0) == "caution"


def test_a_check_of_unknown_kind_or_status_is_refused():
    with pytest.raises(ValueError, match="not known"):
        make("validity", "perhaps")
    with pytest.raises(ValueError, match="not known"):
        make("hope", "pass")
