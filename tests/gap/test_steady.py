"""Every steady state is exact on any grid: nodes, wall stresses and mean velocity against closed forms at 40 digits.

Closed forms of (1/r^m) d/dr(r^m mu dw/dr) + G = 0: textbook knowledge (from memory), written out here once more in
mpmath.  Published values: White, Fluid Mechanics, Table 6.3 (laminar annulus friction).
"""

from __future__ import annotations

from itertools import product

import mpmath as mp
import numpy as np
import pytest
from problems import SHAPES, problem

from transient.gap.system import assemble, steady
from transient.march.readings import steady_stress

GRIDS = [(7, (1.0, 1.0)), (12, (0.2, 0.01)), (33, (2e-3, 0.05)), (90, (1e-3, 1e-3))]
CONDITIONS = {
    "no slip": {},
    "slip at both": {"slips": (0.1, 0.02)},
    "slip at the outer": {"slips": (0.0, 0.3)},
    "free outer": {"kinds": ("moving", "shear_free")},
    "free inner": {"kinds": ("shear_free", "moving")},
    "free outer, slip at the inner": {"kinds": ("moving", "shear_free"), "slips": (0.2, 0.0)},
}
CASES = [
    (shape, name)
    for shape, name in product(SHAPES, CONDITIONS)
    if shape != "pipe" or name in ("no slip", "slip at the outer")
]


def exact(case, speeds, gradient):
    """(velocity as a function of r, wall stresses (2,), mean) at 40 digits."""
    m, a, b = case.metric, mp.mpf(case.inner), mp.mpf(case.outer)
    mu, push = mp.mpf(case.viscosity), mp.mpf(gradient)
    even = {0: lambda r: r, 1: mp.log, 3: lambda r: -1 / (2 * r * r)}[m]  # integral of r^-m

    def even_slope(r):
        return r**-m

    def own(r):
        return -push * r * r / (2 * (m + 1) * mu)

    def own_slope(r):
        return -push * r / ((m + 1) * mu)

    rows, right = [], []
    for end, (wall, r) in enumerate(zip(case.walls, (a, b), strict=True)):
        into = 1 if end == 0 else -1
        if wall.kind == "axis":
            rows.append([0, 1])
            right.append(0)
        elif wall.kind == "shear_free":
            rows.append([0, even_slope(r)])
            right.append(-own_slope(r))
        else:
            slip = into * mp.mpf(wall.slip_length)
            rows.append([1, even(r) - slip * even_slope(r)])
            right.append(mp.mpf(speeds[end]) - own(r) + slip * own_slope(r))
    first, second = mp.lu_solve(mp.matrix(rows), mp.matrix(right))

    def velocity(r):
        return first + own(r) + (second * even(r) if second else 0)

    def stress(r):
        return mu * (r if m == 3 else 1) * (own_slope(r) + (second * even_slope(r) if second else 0))

    over = {0: 0, 1: 1, 3: 1}[m]
    area = (b**2 - a**2) / 2 if m == 1 else b - a
    mean = mp.quad(lambda r: velocity(r) * r**over, [a, (a + b) / 2, b]) / area
    low = mp.mpf(0) if case.walls[0].kind == "axis" else stress(a)
    return velocity, np.array([float(low), float(-stress(b))]), float(mean)


def deviations(case, speeds, gradient, cells, layers):
    """Largest relative error of nodes, of wall stresses and of the mean."""
    with mp.workdps(40):
        velocity, stress, mean = exact(case, speeds, gradient)
        system = assemble(case, cells, layers)
        speeds = np.array(speeds)
        unknown = steady(system, speeds, gradient)
        nodes = system.nodes(unknown, speeds)
        slipping = [w.slip_length > 0 or w.kind != "moving" for w in case.walls]
        inside = slice(None if slipping[0] else 1, None if slipping[1] else -1)
        at = [mp.mpf(r) for r in system.grid.radius]
        at[-1] = mp.mpf(case.outer)
        if case.walls[0].kind == "axis":
            at[0] = mp.mpf(10) ** -30
        true = np.array([float(velocity(r)) for r in at])
    size = max(np.abs(true).max(), np.abs(speeds).max())
    found = steady_stress(system, unknown, speeds, gradient)
    weighed = float(system.grid.mean_weight @ nodes)
    return (
        np.abs(nodes - true)[inside].max() / size,
        np.abs(found - stress).max() / np.abs(stress).max(initial=1e-300),
        abs(weighed - mean) / max(abs(mean), 1e-3 * size),
    )


@pytest.mark.parametrize(("shape", "name"), CASES)
@pytest.mark.parametrize(("cells", "layers"), GRIDS)
def test_steady_flow_is_exact_on_any_grid(shape, name, cells, layers):
    case = problem(shape, **CONDITIONS[name])
    pushes = (0.0,) if shape == "annulus_rotating" else (0.0, 2.5)
    moves = ((0.0, 0.7),) if shape == "pipe" else ((0.3, -0.7), (0.0, 1.0))
    for speeds, gradient in product(moves, pushes):
        nodes, stress, mean = deviations(case, speeds, gradient, cells, layers)
        assert nodes < 1e-11
        assert mean < 1e-11
        if gradient or (shape != "pipe" and "free" not in name):  # else nothing but round-off pulls at the walls
            assert stress < 1e-11


@pytest.mark.parametrize("shape", ["annulus_axial", "annulus_rotating"])
@pytest.mark.parametrize("ratio", [0.01, 0.1, 0.5, 0.9, 0.99, 0.9999])
def test_annuli_of_every_ratio_of_radii(shape, ratio):
    case = problem(shape, inner=ratio, outer=1.0)
    layers = (min(1.0, 0.5 * ratio / (1.0 - ratio)), 0.5)
    for gradient in (0.0,) if shape == "annulus_rotating" else (0.0, 1.0):
        assert max(deviations(case, (0.3, -0.7), gradient, 40, layers)) < 1e-11


def test_thin_cells_keep_their_digits_beside_a_wall_at_rest():
    case = problem(push=1.0)
    system = assemble(case, 300, (1e-9, 1e-9))
    unknown = steady(system, np.zeros(2), 1.0)
    assert system.grid.step.min() < 1e-9
    np.testing.assert_allclose(steady_stress(system, unknown, np.zeros(2), 1.0), [0.5, 0.5], rtol=1e-12)


def test_thin_cells_beside_a_moving_wall_lose_no_more_than_the_speed_s_own_round_off():
    case = problem(upper=1.0)
    system = assemble(case, 120, (1e-5, 1e-5))
    speeds = np.array([0.0, 1.0])
    found = steady_stress(system, steady(system, speeds, 0.0), speeds, 0.0)
    allowed = 4.0 * np.finfo(float).eps / system.grid.step.min()
    np.testing.assert_allclose(found, [1.0, -1.0], atol=allowed)


WHITE = {0.01: 80.11, 0.05: 86.27, 0.1: 89.37, 0.2: 92.35, 0.4: 94.71, 0.6: 95.59, 0.8: 95.92}


@pytest.mark.parametrize("ratio", WHITE)
def test_friction_of_laminar_annuli_as_published(ratio):
    """White, Fluid Mechanics, Table 6.3: Darcy friction factor times Reynolds number on the hydraulic diameter."""
    case = problem("annulus_axial", inner=ratio, outer=1.0)
    system = assemble(case, 60, (0.01, 0.5))
    mean = system.grid.mean_weight @ system.nodes(steady(system, np.zeros(2), 1.0), np.zeros(2))
    diameter = 2.0 * (1.0 - ratio)
    assert 2.0 * diameter**2 / mean == pytest.approx(WHITE[ratio], abs=0.0051)


def test_pipe_and_plates_have_their_textbook_friction():
    """64 and 96: White, Fluid Mechanics, Table 6.3, first and last row."""
    pipe, plates = assemble(problem("pipe"), 9, (1.0, 0.2)), assemble(problem(), 9, (0.3, 0.2))
    for system, diameter, factor in ((pipe, 2.0, 64.0), (plates, 2.0, 96.0)):
        still = np.zeros(2)
        mean = system.grid.mean_weight @ system.nodes(steady(system, still, 1.0), still)
        assert 2.0 * diameter**2 / mean == pytest.approx(factor, rel=1e-12)


def test_torques_on_both_sides_of_a_rotating_gap_are_one():
    """Torque per length 4 pi mu R1^2 R2^2 dOmega / (R2^2 - R1^2) (from memory)."""
    case = problem("annulus_rotating", viscosity=0.7)
    system = assemble(case, 21, (0.2, 0.1))
    speeds = np.array([3.0, -1.0])
    inner, outer = steady_stress(system, steady(system, speeds, 0.0), speeds, 0.0)
    torque = 4.0 * np.pi * 0.7 * (0.5 * 1.5) ** 2 * (-4.0) / (1.5**2 - 0.5**2)
    assert inner * 2.0 * np.pi * 0.5**2 == pytest.approx(torque, rel=1e-12)
    assert outer * 2.0 * np.pi * 1.5**2 == pytest.approx(-torque, rel=1e-12)


def test_a_gap_that_no_wall_holds_has_no_steady_state():
    case = problem(kinds=("shear_free", "shear_free"))
    with pytest.raises(ValueError, match="no wall holds the fluid"):
        steady(assemble(case, 8, (1.0, 1.0)), np.zeros(2), 1.0)


def test_a_wrong_conductance_is_caught():
    """Negative control: one interval's conductance off by a part in a thousand moves nodes and stress."""
    case = problem(upper=1.0)
    system = assemble(case, 12, (0.2, 0.2))
    system.conductance[5] *= 1.001
    speeds = np.array([0.0, 1.0])
    unknown = steady(system, speeds, 0.0)
    assert np.abs(unknown - system.grid.radius[1:-1]).max() > 1e-6
    assert abs(steady_stress(system, unknown, speeds, 0.0)[0] - 1.0) > 1e-6
