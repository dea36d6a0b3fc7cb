"""What must hold whatever the numbers: rest stays rest, mirrors, signs, sums, units, and the thin annulus."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from by_hand import even_steps, marched
from problems import SHAPES, constant, lag, problem, ramp, sine, smooth_ramp, step

from transient.answer import solve
from transient.march.march import Plan

ROWS = ("stress", "mean", "profile", "travel")


def drives(shape):
    """A busy set of drives for a shape (a pipe has no inner wall, a rotating gap no pressure)."""
    push = 0.0 if shape == "annulus_rotating" else lag.build(2.0, 0.2, at=0.05)
    lower = 0.0 if shape == "pipe" else ramp.build(-0.4, 0.1, at=0.1)
    return {"upper": smooth_ramp.build(1.0, 0.3), "lower": lower, "push": push}


@pytest.mark.parametrize("shape", SHAPES)
def test_from_steady_with_nothing_happening_nothing_happens(shape):
    push = 0.0 if shape == "annulus_rotating" else 3.0
    case = problem(shape, upper=0.7, lower=0.0 if shape == "pipe" else -0.2, push=push, start="steady", duration=2.0)
    h = marched(case, 2.0)
    for name in ("stress", "mean", "profile"):
        value = getattr(h, name)
        assert np.abs(value - value[0]).max() <= 1e-12 * np.abs(value).max()
    np.testing.assert_allclose(h.travel[-1], 2.0 * h.profile[0], rtol=1e-12, atol=1e-13)


@pytest.mark.parametrize("shape", SHAPES)
def test_a_fluid_that_moves_with_its_walls_stays_a_solid_body(shape):
    case = problem(shape, upper=0.4, lower=0.0 if shape == "pipe" else 0.4, start="steady", duration=3.0)
    h = marched(case, 3.0)
    assert np.abs(h.profile - 0.4).max() < 1e-14
    assert np.abs(h.stress).max() < 1e-12


@pytest.mark.parametrize("shape", SHAPES)
def test_rest_without_a_drive_is_all_zeros(shape):
    h = marched(problem(shape, duration=1.0), 1.0)
    assert not any(getattr(h, name).any() for name in ROWS)


@pytest.mark.parametrize("shape", SHAPES)
def test_reversed_drives_give_the_reversed_flow_to_the_last_digit(shape):
    case = problem(shape, **drives(shape))
    back = replace(case, speeds=tuple(d.scaled(-1.0) for d in case.speeds), gradient=case.gradient.scaled(-1.0))
    ahead, behind = marched(case, 1.0), marched(back, 1.0)
    for name in ROWS:
        np.testing.assert_array_equal(getattr(ahead, name), -getattr(behind, name))


def test_mirrored_plates_give_the_mirrored_flow():
    low, high = ramp.build(-0.4, 0.1, at=0.1), smooth_ramp.build(1.0, 0.3)
    one = marched(problem(upper=high, lower=low, push=2.0), 1.0, layers=(0.1, 0.3))
    other = marched(problem(upper=low, lower=high, push=2.0), 1.0, layers=(0.3, 0.1))
    assert len(one.time) == len(other.time)
    np.testing.assert_allclose(one.profile, other.profile[:, ::-1], atol=1e-12)
    np.testing.assert_allclose(one.stress, other.stress[:, ::-1], atol=1e-10)
    np.testing.assert_allclose(one.mean, other.mean, atol=1e-12)


@pytest.mark.parametrize("shape", SHAPES)
def test_flows_add_up(shape):
    whole = drives(shape)
    zero = dict.fromkeys(whole, 0.0)
    starts = problem(shape, **whole).inputs(1.0).starts
    plan = even_steps(starts, 1.0, 20)
    together = marched(problem(shape, **whole), 1.0, plan)
    parts = []
    for name in whole:
        # the same break points for all, or the steps would differ
        quiet = {key: on_breaks(whole[key], value) for key, value in (zero | {name: whole[name]}).items()}
        parts.append(marched(problem(shape, **quiet), 1.0, plan))
    for name in ROWS:
        total = sum(getattr(part, name) for part in parts)
        np.testing.assert_allclose(total, getattr(together, name), atol=1e-11)


def on_breaks(drive, value):
    """``value``, or nothing at all on the breaks of ``drive``."""
    if value != 0.0 or not hasattr(drive, "scaled"):
        return value
    return drive.scaled(0.0)


@pytest.mark.parametrize("shape", SHAPES)
def test_other_units_give_the_same_flow(shape):
    """Lengths, times and masses in other units: the dimensionless flow is the same to round-off."""
    size, span, weight = 3.7e-5, 0.013, 870.0  # m, s, and kg/m^3
    viscosity = weight * size**2 / span
    speed = 0.31
    plain = drives(shape)
    inner, outer = (0.0, 1.0) if shape in ("plates", "pipe") else (0.5, 1.5)
    motion = speed / size if shape == "annulus_rotating" else speed
    push = viscosity * speed / size**2
    real = {
        "upper": smooth_ramp.build(motion, 0.3 * span),
        "lower": 0.0 if shape == "pipe" else ramp.build(-0.4 * motion, 0.1 * span, at=0.1 * span),
        "push": 0.0 if shape == "annulus_rotating" else lag.build(2.0 * push, 0.2 * span, at=0.05 * span),
    }
    other = problem(shape, inner=inner * size, outer=outer * size, density=weight, viscosity=viscosity, **real)
    one, two = marched(problem(shape, **plain), 1.0), marched(other, span)
    assert len(one.time) == len(two.time)
    np.testing.assert_allclose(two.profile / motion, one.profile, atol=1e-9)
    traction = viscosity * motion / (1.0 if shape == "annulus_rotating" else size)
    np.testing.assert_allclose(two.stress / traction, one.stress, atol=1e-8)


@pytest.mark.parametrize("shape", ["annulus_axial", "annulus_rotating"])
def test_a_thin_annulus_tends_to_plates(shape):
    """The difference is of the order of gap over radius, and falls with it."""
    off = []
    for clearance in (1e-2, 1e-3):
        outer = 1.0 / clearance + 1.0
        scale = outer if shape == "annulus_rotating" else 1.0  # angular to surface speed
        flat = marched(problem(upper=smooth_ramp.build(1.0, 0.3)), 1.0)
        ring = problem(shape, upper=smooth_ramp.build(1.0 / scale, 0.3), inner=outer - 1.0, outer=outer)
        round_ = marched(ring, 1.0, plan=even_like(flat))
        off.append(np.abs(round_.stress - flat.stress).max() / np.abs(flat.stress).max())
        assert off[-1] < 2.0 * clearance
    assert off[1] < 0.11 * off[0]


def even_like(history):
    """The steps of a history as a plan."""
    rows = history.offset > 0.0
    return Plan(history.offset[rows], np.append(history.piece[1:] != history.piece[:-1], True)[rows], 1)


@pytest.mark.parametrize("start", ["rest", "steady"])
def test_a_case_without_any_motion_is_solved_to_zeros(start):
    solved = solve(problem(start=start))
    assert solved.parts["settling"]["time"] == 0.0
    assert solved.parts["walls"]["upper"]["peak_stress"] == 0.0
    assert solved.parts["flow"]["peak_mean_velocity"] == 0.0
    assert solved.parts["walls"]["upper"]["overshoot"] is None


def test_a_step_that_comes_later_is_the_same_flow_later():
    now = solve(problem(upper=step.build(1.0), duration=1.0, accuracy=1e-4))
    later = solve(problem(upper=step.build(1.0, at=4096.0), duration=4097.0, accuracy=1e-4))
    for name in ("velocity", "flow"):
        difference = later.parts["settling"][name] - 4096.0 - now.parts["settling"][name]
        assert abs(difference) < 1e-4 * now.parts["settling"][name]
    assert later.parts["walls"]["upper"]["peak_time"] == 4096.0


def test_a_change_that_is_none_is_none():
    """A sine of no amplitude and a ramp to where it starts: constants, from the first row on."""
    for drive in (sine.build(0.0, period=1.0, mean=0.3), ramp.build(0.3, 1.0, from_=0.3), constant(0.3)):
        h = marched(problem(upper=drive, start="steady", duration=1.0), 1.0)
        assert np.abs(h.stress - [0.3, -0.3]).max() < 1e-12
