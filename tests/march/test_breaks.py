"""Jumps and kinks: no ringing after them, landed on exactly, and times that keep their digits long after t = 0."""

from __future__ import annotations

import numpy as np
import pytest
from by_hand import even_steps, marched
from problems import SHAPES, problem, ramp, step, trapezoid

from transient.answer import solve
from transient.march.rates import stress_rates


def sign_changes(values):
    """How often neighbours differ in sign, round-off left out."""
    values = values[np.abs(values) > 1e-9 * np.abs(values).max()]
    return int((np.diff(np.sign(values)) != 0).sum())


@pytest.mark.parametrize("shape", SHAPES)
def test_after_a_jump_the_stress_falls_steadily(shape):
    """1 + 2 sum exp(-n^2 pi^2 T) between plates (Christov 2013, arXiv 1305.5999) and its like fall monotonically."""
    h = solve(problem(shape, upper=1.0, duration=2.0)).run.history
    stress = np.abs(h.stress[1:, 1])
    falling = stress > (1.0 + 1e-5) * stress[-1]  # later on, what is left is below the accuracy by far
    assert falling.sum() > 40
    assert (np.diff(stress[falling]) < 0).all()


@pytest.mark.parametrize("shape", SHAPES)
def test_within_a_ramp_the_stress_rises_and_after_it_falls_steadily(shape):
    h = solve(problem(shape, upper=ramp.build(1.0, 0.02), duration=1.0)).run.history
    stress = np.abs(h.stress[:, 1])
    assert (np.diff(stress[h.piece == 0]) > 0).all()
    after = stress[h.piece == 1]
    assert (np.diff(after)[:-1] < 1e-9 * stress.max()).all()


def test_kinks_of_a_trapezoid_raise_no_oscillation():
    """The stress rate changes sign where the drive makes it, not between: at most once in each smooth piece."""
    h = solve(problem(upper=trapezoid.build(1.0, 0.05, 0.1, 0.05), duration=0.6)).run.history
    for piece in range(4):
        rows = h.piece == piece
        for wall in (0, 1):
            assert sign_changes(np.diff(h.stress[rows, wall])) <= 1


def test_large_steps_after_a_jump_do_not_ring():
    """Steps a thousand times longer than the wall cells' own time: their modes must be forgotten, not mirrored."""
    case = problem(upper=1.0, duration=2.0)
    h = marched(case, 2.0, even_steps(np.zeros(1), 2.0, 20), cells=60, layers=(1e-2, 1e-2))
    assert h.offset[1] > 1e3 * (1.0 - h.position[-2]) ** 2
    away = h.stress[1:, 1] + 1.0  # from the steady -1
    assert np.abs(away[1]) < 0.5 * np.abs(away[0])
    assert np.abs(away[-1]) < 1e-4
    assert sign_changes(away[:6]) <= 2


def test_crank_nicolson_alone_would_ring():
    """Negative control for the count of sign changes: the same steps by the trapezoidal rule."""
    case = problem(upper=1.0, duration=2.0)
    h = marched(case, 2.0, even_steps(np.zeros(1), 2.0, 20), cells=60, layers=(1e-2, 1e-2))
    x, u = h.position, h.profile[0, 1:-1] * 0.0
    n, k = len(u), 0.1
    matrix = np.zeros((n, n))
    step_, half = np.diff(x), 0.5 * (x[2:] - x[:-2])
    for i in range(n):
        matrix[i, i] = -(1 / step_[i] + 1 / step_[i + 1]) / half[i]
        if i:
            matrix[i, i - 1] = 1 / step_[i] / half[i]
        if i + 1 < n:
            matrix[i, i + 1] = 1 / step_[i + 1] / half[i]
    source = np.zeros(n)
    source[-1] = 1 / step_[-1] / half[-1]
    stress = []
    for _ in range(20):
        u = np.linalg.solve(np.eye(n) - k / 2 * matrix, u + k / 2 * matrix @ u + k * source)
        stress.append(-(1.0 - u[-1]) / step_[-1])
    assert sign_changes(np.array(stress) + 1.0) > 10


def test_every_break_is_two_rows_at_its_exact_time():
    drive = trapezoid.build(1.0, 0.1, 0.2, 0.3, at=0.7)
    case = problem(upper=drive, duration=5.0)
    solved = solve(case)
    h, starts = solved.run.history, solved.ladder.inputs.starts
    np.testing.assert_array_equal(starts, drive.breaks(5.0))
    for piece, start in enumerate(starts):
        rows = np.flatnonzero(h.piece == piece)
        assert h.offset[rows[0]] == 0.0
        assert h.time[rows[0]] == start
        assert (np.diff(h.offset[rows]) > 0).all()
        length = (starts[piece + 1] if piece + 1 < len(starts) else 5.0) - start
        assert h.offset[rows[-1]] == length
        if piece:
            assert h.time[rows[0] - 1] == start
    np.testing.assert_array_equal(h.time, starts[h.piece] + h.offset)


def test_at_a_finite_break_both_sides_have_one_stress():
    h = solve(problem(upper=ramp.build(1.0, 0.1), push=step.build(2.0, at=0.3), duration=1.0)).run.history
    enters = np.flatnonzero((h.offset == 0.0) & (h.time > 0.0))
    assert len(enters) == 2
    np.testing.assert_array_equal(h.stress[enters], h.stress[enters - 1])
    right, left = (h.profile[np.isin(h.profile_row, rows)] for rows in (enters, enters - 1))
    np.testing.assert_array_equal(right, left)


def test_at_a_jump_only_its_own_wall_s_stress_is_infinite_and_only_there():
    h = solve(problem(upper=step.build(1.0, at=0.5), lower=ramp.build(0.2, 0.1), duration=1.0)).run.history
    rows = np.flatnonzero(np.isnan(h.stress).any(axis=1))
    assert len(rows) == 1
    assert h.time[rows[0]] == 0.5
    assert np.isnan(h.stress[rows[0]]).tolist() == [False, True]


def test_first_steps_far_below_the_resolution_of_the_clock():
    """After t = 10 s, where neighbouring numbers lie 2e-15 s apart, steps of 1e-18 s carry the stress law.

    |stress| = mu U / sqrt(pi nu t) (Stokes 1851, from memory).
    """
    case = problem(upper=step.build(0.2, at=10.0), outer=1e-7, density=900.0, viscosity=0.05, duration=10.001,
                   accuracy=1e-4)  # fmt: skip
    solved = solve(case)
    h = solved.run.history
    after = np.flatnonzero(h.piece == 1)
    assert h.offset[after[1]] < 1e-18
    assert (h.time[after[1:5]] == 10.0).all()
    assert (np.diff(h.offset[after]) > 0).all()
    law = 0.05 * 0.2 / np.sqrt(np.pi * 0.05 / 900.0 * h.offset[after[1:]])
    early = (h.offset[after[1:]] < 1e-2 * case.diffusion_time) & (np.arange(len(after) - 1) > 12)
    assert early.sum() > 10
    np.testing.assert_allclose(-h.stress[after[1:], 1][early], law[early], rtol=1e-3)
    # and the film is in its steady shear long before the run ends: mu U / h
    assert h.stress[-1, 1] == pytest.approx(-0.05 * 0.2 / 1e-7, rel=1e-9)
    # 2/pi sum exp(-n^2 pi^2 T)/n sin(n pi y) falls to 1 % at T = 0.42084 (computed), a tenth of a nanosecond
    assert solved.parts["settling"]["time"] - 10.0 == pytest.approx(0.42084 * case.diffusion_time, abs=1e-13)


def test_rates_of_the_stress_after_a_jump():
    """Against the series 2 sum -n^2 pi^2 exp(-n^2 pi^2 T) of Christov 2013 (arXiv 1305.5999), term by term."""
    h = solve(problem(upper=1.0, duration=0.3), "refinement").run.history
    use = (h.offset > 1e-6) & (h.offset < 0.25)
    decay = (np.pi * np.arange(1, 4000)) ** 2
    terms = np.exp(-np.minimum(decay * h.offset[use][:, None], 700.0))
    moving = 2.0 * (terms @ decay)
    still = 2.0 * (terms @ (decay * -((-1.0) ** np.arange(1, 4000))))
    np.testing.assert_allclose(h.stress_rate[use, 1], moving, rtol=2e-2)
    np.testing.assert_allclose(h.stress_rate[use, 0], still, atol=2e-2 * still.max())


def test_rates_of_a_stress_that_is_a_power_of_the_root_are_exact():
    """1 + 2 s + 3 s^2 in s = sqrt(t), and the same over s after a jump: what the stencil is made for."""
    t = np.geomspace(1e-9, 1.0, 40)
    t = np.concatenate([[0.0], t])
    s = np.sqrt(t)
    piece = np.zeros(len(t), int)
    plain = 1.0 + 2.0 * s + 3.0 * s**2
    with np.errstate(divide="ignore"):
        jumped = np.where(t > 0.0, plain / np.where(s > 0, s, 1.0), np.nan)
    found = stress_rates(piece, t, np.stack([plain, jumped], axis=1))
    np.testing.assert_allclose(found[1:, 0], 1.0 / s[1:] + 3.0, rtol=1e-9)
    np.testing.assert_allclose(found[1:, 1], -0.5 / s[1:] ** 3 + 1.5 / s[1:], rtol=1e-7)
    assert np.isnan(found[0, 1])
