"""What refinement alone says: its errors hold against the series, and see what a coarse grid hides."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from problems import SHAPES, problem, ramp, smooth_ramp, trapezoid

from transient.answer import look, solve
from transient.march.levels import climb
from transient.trust.exact import BETWEEN_MARGIN, compare
from transient.trust.refine import AROUND, MARGIN, ROUNDING, estimate, spread

DRIVES = {
    "ramp": {"upper": ramp.build(1.0, 0.1)},
    "smooth": {"upper": smooth_ramp.build(1.0, 0.3)},
    "trapezoid": {"upper": trapezoid.build(1.0, 0.1, 0.2, 0.05)},
    "jump": {"upper": 1.0},
}


def ladder_of(flow, levels):
    return climb(flow, look(flow), flow.accuracy, 1.0, levels)


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("drive", DRIVES)
def test_estimates_cover_the_difference_to_the_series(shape, drive):
    flow = problem(shape, **DRIVES[drive])
    ladder = ladder_of(flow, 3)
    said, true = estimate(ladder), compare(flow, look(flow), ladder)
    assert said.kind == "estimate"
    finite = [end for end in (0, 1) if np.isfinite(ladder.best.flow.stress[:, end]).all()]
    # the series' own statement carries a margin for what lies between the places compared
    assert (true.peak[finite] / BETWEEN_MARGIN <= said.peak[finite] + 1e-9).all()
    assert true.mean_peak <= said.mean_peak + 1e-9
    # row by row: all but a few, where the two levels' errors happen to cross (nine tenths: a regression value)
    late = ladder.best.flow.offset > 1e-3
    walls = [end for end in (0, 1) if flow.walls[end].kind == "moving"]
    held = true.stress[late][:, walls] <= said.stress[late][:, walls] + 1e-9
    assert held.mean() > 0.9


def test_two_levels_compare_with_the_finer_one_and_are_far_too_careful():
    flow = problem(upper=ramp.build(1.0, 0.1))
    two, three = estimate(ladder_of(flow, 2)), estimate(ladder_of(flow, 3))
    assert two.peak[1] > 3.0 * three.peak[1]


def test_a_planted_difference_is_seen_row_by_row():
    ladder = ladder_of(problem(upper=ramp.build(1.0, 0.1)), 3)
    clean = estimate(ladder)
    other = replace(ladder.next_best.flow, stress=ladder.next_best.flow.stress.copy())
    other.stress[7, 1] += 0.25
    seen = estimate(replace(ladder, others=(replace(ladder.next_best, flow=other),)))
    assert seen.stress[7, 1] == pytest.approx(MARGIN * 0.25, rel=0.05)
    assert clean.stress[7, 1] < 0.01
    # its neighbours are judged with it, the others are not
    beside = np.arange(7 - AROUND, 7 + AROUND + 1)
    assert (seen.stress[beside, 1] >= 0.9 * MARGIN * 0.25).all()
    np.testing.assert_array_equal(np.delete(seen.stress[:, 1], beside), np.delete(clean.stress[:, 1], beside))


def test_the_estimate_never_falls_below_round_off():
    same = np.array([1.0, -4.0, 0.0])
    np.testing.assert_allclose(spread(same, same), 4.0 * ROUNDING)


def test_an_infinite_value_has_no_error_and_spoils_no_other():
    best, other = np.array([np.nan, 2.0]), np.array([np.nan, 1.0])
    np.testing.assert_allclose(spread(best, other), [0.0, MARGIN], rtol=1e-10)


@pytest.mark.parametrize("accuracy", [1e-2, 1e-3, 1e-4])
def test_without_the_series_the_request_is_met_all_the_same(accuracy):
    """Judged afterwards by the series, the peak is as accurate as asked for."""
    flow = problem("pipe", upper=ramp.build(1.0, 0.1), push=2.0, accuracy=accuracy)
    solved = solve(flow, "refinement")
    true = compare(flow, solved.ahead, solved.ladder)
    peak = abs(solved.parts["walls"]["bore"]["peak_stress"])
    assert true.peak[1] <= accuracy * peak
    assert true.peak[1] <= solved.run.errors.peak[1]
