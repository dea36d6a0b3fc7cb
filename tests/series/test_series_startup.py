"""Start-up flows of the textbooks."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from problems import GAPS, problem, step

from transient.series.gapshape import GapShape
from transient.series.modes import modes
from transient.series.solution import Solution, solve

STARTED = step.build(to=1.0)
ONES = np.ones(1)


def at(flow: Solution, *times: float) -> tuple[np.ndarray, np.ndarray]:
    return flow.locate(np.array(times))


# T, u(h/2)/U, moving wall, fixed wall over mu U/h: start-up of plane Couette flow (series in Christov 2013,
# arXiv 1305.5999, evaluated: computed values)
COUETTE = [
    (0.01, 0.0004069520, 5.641895835, 1.567087e-10), (0.05, 0.1138441966, 2.523132532, 0.0340014664),
    (0.1, 0.2627562698, 1.784286114, 0.2928996518), (0.2, 0.4115664301, 1.278566999, 0.7229223898),
    (0.5, 0.4954215049, 1.014383772, 0.9856162386), (1.0, 0.4999670720, 1.000103446, 0.9998965536),
]  # fmt: skip


def test_plane_couette_flow() -> None:
    flow = solve(problem(upper=STARTED), 2.0)
    time, middle, moving, fixed = np.array(COUETTE).T
    stress, bound = flow.stress(*at(flow, *time))
    np.testing.assert_allclose(stress, np.stack([fixed, -moving], axis=1), atol=6e-10)
    np.testing.assert_allclose(flow.velocity(*at(flow, *time), 0.5 * ONES)[0][:, 0], middle, atol=6e-11)
    assert (bound < 1e-11 * moving[:, None]).all()


@pytest.mark.parametrize("age", [1e-14, 1e-10, 1e-6, 4.9e-3, 5.1e-3, 0.3])
def test_plane_couette_flow_by_images_at_thirty_digits(age: float) -> None:
    # Carslaw & Jaeger (1959), 12.5: images and error functions; holds at any age, young or old
    flow = solve(problem(upper=STARTED), 2.0)
    with mp.workdps(30):
        t = mp.mpf(age)
        moving = (1 + 2 * sum(mp.exp(-mp.mpf(k * k) / t) for k in range(1, 20))) / mp.sqrt(mp.pi * t)
        fixed = 2 * sum(mp.exp(-mp.mpf((k + 0.5) ** 2) / t) for k in range(20)) / mp.sqrt(mp.pi * t)
        y = mp.mpf("0.8")
        images = sum(
            mp.erfc((2 * k + 1 - y) / (2 * mp.sqrt(t))) - mp.erfc((2 * k + 1 + y) / (2 * mp.sqrt(t)))
            for k in range(30)
        )
    stress, bound = flow.stress(*at(flow, age))
    assert (np.abs(stress[0] - [float(fixed), -float(moving)]) <= bound[0]).all()
    assert bound[0, 1] < 1e-11 * float(moving)
    velocity, off = flow.velocity(*at(flow, age), np.array([0.8]))
    assert abs(velocity[0, 0] - float(images)) <= off[0] < 1e-11


# Szymanski (1932): times nu t / R^2 (pipe) and nu t / a^2 with a half the gap (plates) to 90, 95, 99, 99.9 % of the
# centre's velocity, the flow rate, the wall stress (series as in the paper, evaluated: computed values)
SZYMANSKI = {
    ("pipe", "centre"): [0.41589, 0.53574, 0.81404, 1.21219],
    ("pipe", "flow"): [0.39051, 0.51037, 0.78867, 1.18682],
    ("pipe", "stress"): [0.33441, 0.45426, 0.73256, 1.13071],
    ("plates", "centre"): [0.94599, 1.22691, 1.87919, 2.81239],
    ("plates", "flow"): [0.92730, 1.20822, 1.86050, 2.79370],
    ("plates", "stress"): [0.84809, 1.12901, 1.78129, 2.71449],
}


@pytest.mark.parametrize(("shape", "quantity"), SZYMANSKI)
def test_times_of_poiseuille_start_up(shape: str, quantity: str) -> None:
    flow = solve(problem(shape, push=STARTED), 10.0)
    scale, centre, end = (1.0, 0.0, (0.25, 0.125, -0.5)) if shape == "pipe" else (0.25, 0.5, (0.125, 1 / 12, -0.5))
    where = at(flow, *(scale * t for t in SZYMANSKI[shape, quantity]))
    found = {
        "centre": lambda: flow.velocity(*where, centre * ONES)[0][:, 0] / end[0],
        "flow": lambda: flow.mean(*where)[0] / end[1],
        "stress": lambda: flow.stress(*where)[0][:, 1] / -end[2],
    }[quantity]()
    # half a unit of the fifth decimal in time, times the slowest decay rate
    np.testing.assert_allclose(found, [0.9, 0.95, 0.99, 0.999], atol=3.2e-6)


def test_poiseuille_spot_values() -> None:
    # the same series at T = 0.1: centre, flow, stress (computed values)
    pipe, plates = solve(problem("pipe", push=STARTED), 1.0), solve(problem("plates", push=STARTED), 1.0)
    found = [
        pipe.velocity(*at(pipe, 0.1), 0 * ONES)[0][0, 0] / 0.25, pipe.mean(*at(pipe, 0.1))[0][0] / 0.125,
        pipe.stress(*at(pipe, 0.1))[0][0, 1] / 0.5, plates.velocity(*at(plates, 0.025), 0.5 * ONES)[0][0, 0] / 0.125,
        plates.mean(*at(plates, 0.025))[0][0] * 12, plates.stress(*at(plates, 0.025))[0][0, 0] / 0.5,
    ]  # fmt: skip
    table = [0.385189504, 0.461754458, 0.605824194, 0.197746365, 0.228635068, 0.356823400]
    np.testing.assert_allclose(found, table, atol=6e-10)


def test_spin_up_of_a_full_cylinder() -> None:
    # Acheson, Elementary Fluid Dynamics: angular momentum fraction 1 - 8 sum exp(-j1^2 T)/j1^2, evaluated. A hair-thin
    # shear-free core stands for the axis: its effect is of the order of its radius to the fourth.
    core = 1e-3
    gap = problem("annulus_rotating", upper=STARTED, inner=core, outer=1.0, kinds=("shear_free", "moving"))
    flow = solve(gap, 2.0)
    times = np.array([0.01, 0.05, 0.1, 0.2])
    x, weight = np.polynomial.legendre.leggauss(60)
    r, weight = core + (1 - core) * (x + 1) / 2, weight * (1 - core) / 2
    momentum = flow.velocity(*flow.locate(times), r)[0] @ (4 * weight * r**3)
    table = [0.392561606, 0.724171172, 0.873304053, 0.971081520]
    np.testing.assert_allclose(momentum, table, atol=2e-8)
    on_axis = flow.velocity(*flow.locate(np.array([0.37560])), core * ONES)[0][0, 0]
    assert on_axis == pytest.approx(0.99, abs=8e-5)


@pytest.mark.parametrize("shape", GAPS)
def test_sudden_start_near_the_wall_is_that_of_stokes(shape: str) -> None:
    # Stokes's first problem: mu U / sqrt(pi nu t) and erfc(y / 2 sqrt(nu t)); curvature enters at order sqrt(nu t) / R
    speed = 1.5 if shape == "annulus_rotating" else 1.0
    radius = GAPS[shape][2]
    flow = solve(problem(shape, upper=step.build(to=1.0)), 1.0)
    age = 1e-10
    stress = flow.stress(*at(flow, age))[0][0, 1]
    assert stress == pytest.approx(-speed / np.sqrt(np.pi * age), rel=3e-5)
    velocity = flow.velocity(*at(flow, age), np.array([radius - 1e-5]))[0][0, 0]
    assert velocity == pytest.approx(0.4795001222, rel=3e-5)


def test_a_wrong_root_is_noticed() -> None:
    # the comparison can fail: the same series with its first root off by 1e-9
    flow = solve(problem(upper=STARTED), 2.0)
    kept = modes(GapShape(0, 0.0, 0.0, 0.0), 2)
    t = 0.05
    exact = flow.stress(*at(flow, t))[0][0, 1]
    wrong = -1 - 2 * sum(np.exp(-((n * kept.root[0] * (1 + 1e-9)) ** 2) * t) for n in range(1, 40))
    right = -1 - 2 * sum(np.exp(-((n * kept.root[0]) ** 2) * t) for n in range(1, 40))
    bound = flow.stress(*at(flow, t))[1][0, 1]
    assert abs(right - exact) <= bound < abs(wrong - exact)
