"""Exact answers under bodies and prescribed flow, against judges that share nothing with them."""

from __future__ import annotations

from dataclasses import replace

import mpmath as mp
import numpy as np
import pytest
from closed_cases import CASES, PLATES, PUSH, ramp
from reference.cases import tree_of
from reference.closed import Plant

from transient.case.model import Case
from transient.gap.problem import Problem
from transient.gap.system import assemble
from transient.march.coupled import dense, slowest
from transient.series.closing import Closing
from transient.series.gapshape import SeriesError, shape_of
from transient.series.oscillation import determinant, swings
from transient.series.solution import solve

UNTIL = 5.0
TIMES = np.sort(np.concatenate([np.geomspace(2e-3, UNTIL, 24), [0.1, 0.2, 0.3]]))


def problem(plain: dict) -> Problem:
    return Case(tree_of({"duration": UNTIL, "accuracy": 1e-3, "settle_within": 0.01} | plain)).problem()


def answers(case: Problem, times: np.ndarray) -> dict[str, np.ndarray]:
    """Series answers just before ``times`` in the judge's form."""
    exact = solve(case, UNTIL)
    at = exact.locate(np.nextafter(times, 0.0))
    walls, motion = exact.stress_and_mean(*at)[0].T, exact.motion(*at)[0].T
    return {"stress": walls[:2], "mean": walls[2], "speed": motion[:2], "acceleration": motion[2:4],
            "place": motion[4:6], "gradient": motion[6]}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_every_quantity_agrees_with_finite_elements(name):
    # the judge: its own equations, finite elements and modes (tests/reference/closed.py)
    run = Plant(CASES[name]).run(UNTIL)
    true, found = run.at(TIMES), answers(problem(CASES[name]), TIMES)
    bodies = [end for end, wall in enumerate(problem(CASES[name]).walls) if wall.body is not None]
    for key in found:
        if key == "acceleration" and name == "massless plate":
            continue  # that of a node without mass is not what finite elements are good at
        rows = np.atleast_2d(true[key])
        picked = bodies if key in ("speed", "acceleration", "place") else range(len(rows))
        size = np.abs(rows[list(picked)]).max(initial=0.0)
        for end in picked:
            series = np.atleast_2d(found[key])[end]
            np.testing.assert_allclose(series, rows[end], rtol=0, atol=2e-6 * size + 1e-14, err_msg=key)


def test_the_judges_see_a_mass_that_is_off():
    # a planted error: a thousandth of the mass
    wrong = problem(CASES["pushed plate"])
    wall = wrong.walls[1]
    heavier = replace(wall, body=replace(wall.body, mass=1.001 * wall.body.mass))
    wrong = replace(wrong, walls=(wrong.walls[0], heavier))
    true = Plant(CASES["pushed plate"]).run(UNTIL).at(TIMES)["speed"][1]
    assert np.abs(answers(wrong, TIMES)["speed"][1] - true).max() > 1e-5 * np.abs(true).max()


def talbot(image, time: float) -> float:
    """Fixed Talbot inversion (Abate & Valko 2004) at 60 digits."""
    with mp.workdps(60):
        return float(mp.invertlaplace(image, time, method="talbot", degree=90))


@pytest.mark.parametrize(("mass", "stiffness"), [(0.05, 0.0), (0.002, 0.0), (0.05, 2.0), (0.0, 0.5), (5e-6, 0.0)])
def test_stated_bounds_hold_at_sixty_digits(mass, stiffness):
    """A plate over a fixed one in hyperbolic functions, after one ramp of its force; early and late."""
    case = problem(PLATES | {"walls": {"upper": {"body": PUSH | {"mass": mass, "stiffness": stiffness}}}})
    exact = solve(case, UNTIL)
    drag, area, h = mp.mpf("1e-3"), mp.mpf("5e-3"), mp.mpf("1e-3")

    def speed(s):
        q = mp.sqrt(s / mp.mpf("1e-6"))
        film = drag * area * q * mp.coth(q * h)
        return mp.mpf("1e-2") / s**2 / (mass * s + film + mp.mpf(stiffness) / s)

    for time in (1e-7, 1e-3, 0.09):
        at = exact.locate(np.array([time]))
        value, bound = exact.motion(*at)
        walls, wall_bound = exact.stress_and_mean(*at)
        image = {1: speed, 3: lambda s: s * speed(s), 5: lambda s: speed(s) / s}
        for column, f in image.items():
            assert abs(value[0, column] - talbot(f, time)) <= bound[0, column], (time, column)

        def below(s):
            q = mp.sqrt(s / mp.mpf("1e-6"))
            return drag * q / mp.sinh(q * h) * speed(s)

        assert abs(walls[0, 0] - talbot(below, time)) <= wall_bound[0, 0]


# Roots of x tan x = C: Essentials of Applied Mathematics for Scientists and Engineers, App. A, Table A.1, pp. 159-160
# (its heading prints the sign of C wrongly); C = 1 in full digits evaluated here from the equation.
ROOTS = {
    0.01: (0.0998, 3.1448, 6.2848, 9.4258),
    0.1: (0.3111, 3.1731, 6.2991, 9.4354),
    1.0: (0.8603, 3.4256, 6.4373, 9.5293),
    10.0: (1.4289, 4.3058, 7.2281, 10.2003),
}


def block(ratio: float, **more) -> Problem:
    """A plate on a film with ``ratio`` = density x gap x area / mass."""
    return problem(PLATES | {"walls": {"upper": {"body": PUSH | {"mass": 5e-3 / ratio} | more}}})


@pytest.mark.parametrize("ratio", ROOTS)
def test_poles_are_the_tabled_roots(ratio):
    case = block(ratio)
    closing = Closing.of(case, shape_of(case))
    for root in ROOTS[ratio]:
        s = -(np.array([root - 6e-5, root + 6e-5]) ** 2) + 0j
        low, high = determinant(closing, s)[0].real
        assert low * high < 0.0, root
    s = -(np.array([ROOTS[ratio][0] - 3e-3, ROOTS[ratio][0] - 1e-3]) ** 2) + 0j
    low, high = determinant(closing, s)[0].real
    assert low * high > 0.0  # what is tested above can fail


@pytest.mark.parametrize("ratio", ROOTS)
def test_the_solvers_slowest_decay_is_the_first_root(ratio):
    case = block(ratio)
    system = assemble(case, 400, (1.0, 1.0))
    rate = case.diffusion_time / slowest(dense(case, system))
    assert np.sqrt(rate) == pytest.approx(ROOTS[ratio][0], abs=6e-5)


def test_a_block_on_an_incline_reaches_its_terminal_speed():
    # V = m g sin(theta) h / (mu A), time constant m h / (mu A) of the massless film (common practice, no source)
    plain = tree_of(PLATES | {"duration": 3000.0, "accuracy": 1e-3, "settle_within": 0.01})
    plain["wall"] = {"upper": {"body": {"mass": "2 kg", "incline": "0.01 deg"}}}
    case = Case(plain).problem()
    exact = solve(case, 3000.0)
    pull = 2.0 * 9.80665 * np.sin(np.radians(0.01))
    terminal, constant = pull * 1e-3 / (1e-3 * 5e-3), 2.0 * 1e-3 / (1e-3 * 5e-3)
    times = constant * np.array([0.5, 1.0, 2.0, 5.0])
    speed = exact.motion(*exact.locate(times))[0][:, 1]
    # the film adds a third of its mass (checks the limit, and no more than the limit)
    np.testing.assert_allclose(speed, terminal * (1 - np.exp(-times / constant / (1 + 5e-3 / 3 / 2.0))), rtol=1e-5)


def test_a_light_film_leaves_a_damped_oscillator():
    # pole of m x'' + c x' + k x = 0: -c/2m +- i sqrt(k/m - (c/2m)^2); textbook, from memory
    case = block(1e-6, stiffness=40.0, damping=30.0)
    shape = shape_of(case)
    pole = swings(Closing.of(case, shape)).pole / case.diffusion_time
    mass, total = 5e3, 30.0
    assert len(pole) == 1
    film = 5e-3 * np.sqrt(np.sqrt(40.0 / mass) * 1e-3 * 1000.0)
    expected = complex(-total / 2 / mass, np.sqrt(40.0 / mass - (total / 2 / mass) ** 2))
    assert abs(pole[0] - expected) < 2 * film / mass


@pytest.mark.parametrize("over", [1.0, 1.0 + 1e-9, 1.0 - 1e-9, 1.0 + 1e-3, 0.7])
def test_critical_damping_has_no_gap(over):
    """A double root, or two that are close: the response is smooth through it (limit t exp(-w t), from memory)."""
    mass, w = 50.0, 0.8
    case = block(5e-3 / mass, stiffness=mass * w * w, damping=2.0 * mass * w * over, force=ramp(0.4, 1e-6))
    times = np.array([0.3, 1.0, 2.5, 5.0 - 1e-9])
    exact = solve(case, UNTIL)
    value, bound = exact.motion(*exact.locate(times))
    run = Plant(PLATES | {"walls": {"upper": {"body": {
        "mass": mass, "area": 5e-3, "stiffness": mass * w * w, "damping": 2.0 * mass * w * over,
        "force": ramp(0.4, 1e-6)}}}}).run(UNTIL)  # fmt: skip
    assert np.isfinite(value).all()
    assert bound[:, 1].max() < 1e-9 * np.abs(value[:, 1]).max()
    if abs(over - 1.0) > 1e-4:  # the judge's own modes coincide there
        np.testing.assert_allclose(value[:, 1], run.at(times)["speed"][1], rtol=1e-6)
    else:
        np.testing.assert_allclose(value[:, 1], 0.4 / mass * times * np.exp(-w * times), rtol=2e-3)


def test_a_force_speed_curve_has_no_series():
    case = problem(PLATES | {"walls": {"upper": {"body": PUSH | {"mass": 5e-3}}}})
    wall = case.walls[1]
    curved = replace(wall, body=replace(wall.body, curve=((0.0, 1.0), (1.0, 0.0))))
    with pytest.raises(SeriesError, match="curve"):
        solve(replace(case, walls=(case.walls[0], curved)), UNTIL)
