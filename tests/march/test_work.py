"""Work done: steps, solves and compilations, which follow the drive's features and not the ratio of scales."""

from __future__ import annotations

from itertools import pairwise

from by_hand import traced
from problems import SHAPES, problem, ramp, sine, step

from transient.answer import solve
from transient.march import kernel
from transient.march.march import halved

FILM = {"outer": 40e-6, "density": 870.0, "viscosity": 0.08}  # its diffusion time: 17 microseconds


def test_a_thin_film_driven_over_ten_seconds_takes_a_few_hundred_steps():
    solved = solve(problem(upper=ramp.build(0.2, 10.0), **FILM))
    assert solved.ladder.steps < 300
    assert solved.ladder.cells < 100


def test_cost_does_not_grow_with_the_ratio_of_time_scales():
    times = (1e-6, 1e-4, 1e-2, 1.0, 100.0)
    steps = [solve(problem(upper=ramp.build(0.2, over), **FILM)).ladder.steps for over in times]
    assert max(steps) < 400
    assert max(steps) < 4 * min(steps)


def test_cost_does_not_grow_with_the_time_before_something_happens():
    steps = [solve(problem(upper=step.build(0.2, at=at), duration=at + 1.0)).ladder.steps for at in (1.0, 1e3, 1e6)]
    assert max(steps) <= min(steps) + 20


def test_one_more_decimal_costs_less_than_four_times_the_steps():
    steps = [solve(problem(upper=ramp.build(1.0, 0.1), accuracy=a)).ladder.steps for a in (1e-2, 1e-3, 1e-4, 1e-5)]
    assert all(low < high < 4 * low for low, high in pairwise(steps))


def test_a_jump_s_cost_rises_by_steps_not_by_powers():
    """The mean velocity after a jump needs first cells in proportion to the accuracy: they cost a logarithm."""
    steps = [solve(problem(upper=1.0, accuracy=a)).ladder.steps for a in (1e-4, 1e-5, 1e-6)]
    assert steps[2] < 8 * steps[0]
    assert steps[2] < 4000


def test_steps_of_a_wave_follow_its_periods_until_it_repeats():
    """The flow itself is followed through every period; its way into the periodic state is not."""
    few, many = (
        solve(problem(upper=sine.build(1.0, period=0.5), duration=n * 0.5), "refinement").ladder for n in (6, 24)
    )
    assert many.steps < 4.4 * few.steps


def test_an_adaptive_step_costs_three_solves_and_a_planned_one_two():
    case = problem(upper=ramp.build(1.0, 0.1), duration=1.0)
    base = traced(case, 1.0)
    assert 3 * base.steps <= base.solves <= 1.1 * 3 * base.steps  # few steps are taken back
    fine = traced(case, 1.0, cells=48, plan=halved(base))
    assert fine.steps == base.steps  # recorded
    assert fine.solves == 2 * 2 * fine.steps


def test_the_kernel_is_compiled_once_for_all_cases():
    for shape in SHAPES:
        wave = 0.0 if shape == "pipe" else sine.build(1.0, period=0.2)
        solve(problem(shape, lower=wave, duration=0.5), "refinement")
        solve(problem(shape, upper=ramp.build(1.0, 0.1), slips=(0.0, 0.1), duration=0.5))
    assert len(kernel.march_open.signatures) == 1
    assert len(kernel.march_closed.signatures) <= 1
