"""Random drives in every shape against Laplace transforms inverted at 30 digits; every stated bound must hold."""

from __future__ import annotations

import numpy as np
import pytest
from problems import problem
from talbot import response

from transient.drive.pieces import Drive, Pieces, Track
from transient.gap.problem import Problem
from transient.series.gapshape import shape_of
from transient.series.modes import roots
from transient.series.regime import steady
from transient.series.solution import solve

ROWS = ("lower", "upper", "push")


def check(case: Problem, row: int, pieces: Pieces, t: float, more: int = 1) -> float:
    """Assert that every bound holds at ``t``; returns the largest relative bound of the stresses."""
    flow = solve(case, 2 * t)
    where = flow.locate(np.array([t]))
    radii = case.inner + np.array([0.02, 0.7]) * case.gap
    values = np.zeros(3)
    values[row] = pieces.before
    before = steady(case, values)
    start = np.concatenate([before.stress, before.velocity(radii)])
    expected = start + response(case, pieces, row, t, radii, more)
    stress, bound = flow.stress(*where)
    velocity, off = flow.velocity(*where, radii)
    assert (np.abs(stress[0] - expected[:2]) <= bound[0]).all()
    assert np.abs(velocity[0] - expected[2:]).max() <= off[0]
    return float(bound.max() / np.abs(stress).max())


def random_pieces(random: np.random.Generator, count: int, scale: float, rate: complex) -> Pieces:
    """Cubics with one exponential each, on breaks spread over decades; every other break continuous."""
    starts = np.concatenate([[0.0], np.sort(10 ** random.uniform(-3, 0, count - 1)) * scale])
    poly = random.normal(size=(count, 4)) / scale ** np.arange(4)
    for j in range(2, count, 2):
        poly[j, 0] = poly[j - 1] @ (starts[j] - starts[j - 1]) ** np.arange(4)
    coeff = random.normal(size=(count, 1)) * (np.arange(count) % 2 == 1)[:, None]
    return Pieces(starts, poly, coeff + 0j, np.full((count, 1), rate, complex), float(random.normal()))


def case_of(shape: str, row: int, pieces: Pieces, ratio: float, **more) -> Problem:  # type: ignore[no-untyped-def]
    if shape.startswith("annulus"):
        more |= {"inner": ratio / (1 - ratio), "outer": ratio / (1 - ratio) + 1.0}
    return problem(shape, start="steady", **{ROWS[row]: Drive((Track(pieces),), pieces.before)}, **more)


CASES = [
    # shape, driven row, inner/outer, slip lengths, shear-free end, scale of the breaks, kind of exponential
    ("plates", 1, 0.0, (0.0, 0.0), None, 1e-5, "meets"),
    ("plates", 2, 0.0, (0.3, 0.1), None, 3e-2, "wave"),
    ("plates", 0, 0.0, (0.0, 0.0), 1, 1.0, "near"),
    ("pipe", 2, 0.0, (0.0, 0.0), None, 1e-3, "meets"),
    ("pipe", 1, 0.0, (0.0, 0.7), None, 0.3, "damped"),
    ("annulus_axial", 1, 0.01, (0.0, 0.0), None, 0.1, "meets"),
    ("annulus_axial", 0, 0.9999, (0.0, 0.0), None, 1e-2, "near"),
    ("annulus_axial", 2, 0.5, (0.2, 0.4), None, 1e-6, "wave"),
    ("annulus_rotating", 0, 0.01, (0.0, 0.0), None, 1e-2, "wave"),
    ("annulus_rotating", 1, 0.9999, (0.0, 0.2), None, 0.2, "meets"),
    ("annulus_rotating", 0, 0.3, (0.0, 0.0), 1, 1e-4, "damped"),
]


@pytest.mark.parametrize(("shape", "row", "ratio", "slips", "free", "scale", "kind"), CASES)
def test_random_drives(shape, row, ratio, slips, free, scale, kind) -> None:  # type: ignore[no-untyped-def]
    random = np.random.default_rng(sum(shape.encode()) + row)
    more: dict = {"slips": slips}
    if free is not None:
        more["kinds"] = tuple("shear_free" if end == free else "moving" for end in (0, 1))
    calm = case_of(shape, row, random_pieces(random, 1, 1.0, -1.0), ratio, **more)
    # a lag whose rate meets the first eigenvalues or nearly does; waves
    slow = roots(shape_of(calm), 3) ** 2
    rate = {"meets": -slow[1], "near": -slow[0] * (1 + 1e-9), "wave": 6j / scale, "damped": (-2 + 4j) / scale}[kind]
    pieces = random_pieces(random, 4, scale, rate)
    case = case_of(shape, row, pieces, ratio, **more)
    # few nodes: one break's answer in a round gap takes the judge a second
    for since in (1e-6, 0.5) if ratio != 0.01 else (0.1,):
        assert check(case, row, pieces, pieces.starts[-1] + since * scale) < 1e-10


@pytest.mark.parametrize("age", [1e-12, 1e-7, 2e-3])
def test_very_short_times_after_a_jump_and_a_kink(age: float) -> None:
    pieces = Pieces(np.zeros(1), np.array([[1.0, 3.0, 0.0, 0.0]]), np.zeros((1, 0), complex), np.zeros((1, 0), complex))
    case = case_of("annulus_axial", 0, pieces, 0.2)
    assert check(case, 0, pieces, age) < 1e-11


def test_a_short_pulse_long_ago_and_just_now() -> None:
    # an S-shaped pulse of 1e-6 diffusion times: its cubics continued would be larger than the answer by 1e10 and more
    width = 1e-6
    starts = np.array([0.0, 0.5 * width, width])
    curve = np.array([1.0, 1 / width, 1 / width**2, 1 / width**3])
    poly = np.array([[0.0, 0.0, 1.0, -0.7], [0.2, -0.3, 1.0, 0.4], [0.0] * 4]) * curve
    none = np.zeros((3, 0), complex)
    pieces = Pieces(starts, poly, none, none)
    case = case_of("plates", 1, pieces, 0.0)
    for t in (1.2 * width, 30 * width, 1e-3, 0.3):
        check(case, 1, pieces, t, more=3)
