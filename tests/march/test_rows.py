"""What is stored: straight lines between rows within the accuracy, jumps as two rows, one NaN at an infinite stress."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from problems import SHAPES, constant, lag, problem, ramp, sine, step, trapezoid
from scipy.special import erfc

from transient.answer import solve
from transient.march.rows import Rows, denser, profile_times, stored
from transient.result.history import between

SHARES = np.linspace(0.0, 1.0, 7)[1:-1]


def kept(case, judge="series") -> tuple[Rows, object]:
    solved = solve(case, judge)
    return told(case, solved), solved


def told(case, solved, errors=None) -> Rows:
    errors = solved.run.errors.stress if errors is None else errors
    return stored(case, solved.run.history, solved.ladder.inputs, errors)


def lines(rows: Rows, name: str, wall: int | None = None) -> tuple[np.ndarray, np.ndarray]:
    """(times, values) on the straight lines between the stored rows."""
    value = getattr(rows, name)
    value = value if wall is None else value[:, wall]
    low, high = rows.time[:-1, None], rows.time[1:, None]
    t = low + (high - low) * SHARES
    return t.ravel(), (value[:-1, None] + (value[1:] - value[:-1])[:, None] * SHARES).ravel()


CASES = {
    "ramp": lambda shape: {"upper": ramp.build(1.0, 0.1)},
    "late ramp": lambda shape: {"upper": ramp.build(1.0, 1e-3, at=2.0)},
    "trapezoid": lambda shape: {"upper": trapezoid.build(1.0, 0.1, 0.2, 0.05)},
    "lag": lambda shape: {"upper": lag.build(1.0, 0.3)},
    "push": lambda shape: {"push": 1.0} if shape != "annulus_rotating" else {"upper": ramp.build(1.0, 0.3)},
}


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("name", CASES)
@pytest.mark.parametrize("accuracy", [1e-2, 1e-3])
def test_straight_lines_follow_the_history(shape, name, accuracy):
    rows, solved = kept(problem(shape, accuracy=accuracy, **CASES[name](shape)))
    history = solved.run.history
    for wall in (0, 1):
        t, line = lines(rows, "stress", wall)
        curve = history.stress_curve(wall)
        off = np.abs(line - curve.sample(t)).max()
        assert off <= accuracy * np.abs(curve.value).max(initial=1e-300)
    t, line = lines(rows, "mean")
    curve = history.mean_curve()
    assert np.abs(line - curve.sample(t)).max() <= accuracy * np.abs(curve.value).max()


@pytest.mark.parametrize("accuracy", [1e-2, 1e-3, 1e-4])
def test_straight_lines_follow_the_exact_stress_of_a_ramp_between_plates(accuracy):
    """Stress of a ramp over T between plates: (S(t) - S(t - T))/T with the integral S of Christov's (2013) series."""
    over = 0.1
    rows, _ = kept(problem(upper=ramp.build(1.0, over), accuracy=accuracy))
    n = np.arange(1, 400)
    eigen = (n * np.pi) ** 2

    def moving(t):
        late = t + 1.0 / 3.0 - 2.0 * (np.exp(-eigen * t[:, None]) / eigen).sum(axis=1)
        # the integral of erfc images for the young layer, where the series would need too many terms
        young = 2.0 * np.sqrt(t / np.pi) + 4.0 * np.sqrt(t / np.pi) * np.exp(-1.0 / np.maximum(t, 1e-12)) - 4.0 * erfc(
            1.0 / np.sqrt(np.maximum(t, 1e-12))
        )  # fmt: skip
        return np.where(t < 0.05, young, late)

    t, line = lines(rows, "stress", 1)
    exact = moving(np.maximum(t, 0.0)) - np.where(t > over, moving(np.maximum(t - over, 0.0)), 0.0)
    assert np.abs(-line - exact / over).max() <= accuracy * np.abs(exact).max() / over


@pytest.mark.parametrize("accuracy", [2e-2, 1e-2, 1e-3, 1e-4])
def test_after_an_infinite_stress_lines_follow_the_local_value(accuracy):
    """1 + 2 sum exp(-n^2/t) over sqrt(pi t): images of Stokes' first problem between plates (from memory)."""
    rows, _ = kept(problem(upper=1.0, accuracy=accuracy))
    t, line = lines(rows, "stress", 1)
    use = np.isfinite(line) & (t < 0.5)
    n = np.arange(1, 30)
    exact = (1.0 + 2.0 * np.exp(-(n**2) / t[use, None]).sum(axis=1)) / np.sqrt(np.pi * t[use])
    assert use.sum() > 100
    np.testing.assert_allclose(-line[use], exact, rtol=accuracy)


@pytest.mark.parametrize(
    "case",
    [
        {"upper": 1.0},
        {"upper": step.build(1.0, at=0.3), "lower": step.build(-0.5, at=0.6)},
        {"upper": trapezoid.build(1.0, 0.0, 0.1, 0.0), "push": step.build(1.0, at=0.1)},
        {"upper": ramp.build(1.0, 1e-4, at=5.0)},
        {"push": step.build(1.0, at=1e6), "duration": 1e6 + 1.0},
    ],
)
def test_times_rise_strictly_and_only_infinite_stresses_are_nan(case):
    rows, solved = kept(problem(**case))
    assert (np.diff(rows.time) > 0).all()
    assert rows.time[0] == 0.0
    assert rows.time[-1] == solved.ahead.until
    drives = [solved.ladder.inputs.row(wall) for wall in (0, 1)]
    for wall in (0, 1):
        jumps = drives[wall].starts[drives[wall].jumps(0) != 0.0]
        np.testing.assert_array_equal(rows.time[np.isnan(rows.stress[:, wall])], jumps)
    for name in ("speed", "mean", "gradient"):
        assert np.isfinite(getattr(rows, name)).all()


def test_a_jump_is_two_rows_at_neighbouring_times():
    rows, _ = kept(problem(upper=step.build(1.0, at=0.3), push=step.build(2.0, at=0.5), duration=1.0))
    for time, column, values in ((0.3, rows.speed[:, 1], (0.0, 1.0)), (0.5, rows.gradient, (0.0, 2.0))):
        late = int(np.flatnonzero(rows.time == time)[0])
        assert rows.time[late - 1] == np.nextafter(time, -np.inf)
        assert (column[late - 1], column[late]) == values
    assert np.isfinite(rows.stress[np.flatnonzero(rows.time == 0.3)[0] - 1]).all()


def test_a_break_without_a_jump_is_one_row():
    rows, _ = kept(problem(upper=ramp.build(1.0, 0.1, at=0.2), duration=1.0))
    for time in (0.2, 0.2 + 0.1):
        assert ((rows.time > time - 1e-9) & (rows.time < time + 1e-9)).sum() == 1


def test_a_drive_that_bends_between_steps_is_stored_bent():
    """The march may step over several waves of a pressure that hardly matters; its rows may not."""
    case = problem(upper=1.0, push=sine.build(2.0, period=0.3), duration=1.5, accuracy=1e-3)
    rows, _ = kept(case, "refinement")
    t, line = lines(rows, "gradient")
    assert np.abs(line - 2.0 * np.sin(2.0 * np.pi * t / 0.3)).max() < 1e-3 * 2.0
    speed = problem(upper=sine.build(2.0, period=0.3), duration=1.5, accuracy=1e-3)
    rows, _ = kept(speed, "refinement")
    t, line = lines(rows, "speed", 1)
    assert np.abs(line - 2.0 * np.sin(2.0 * np.pi * t / 0.3)).max() < 1e-3 * 2.0


def test_rows_are_no_more_than_the_lines_need():
    for accuracy, most in ((1e-2, 400), (1e-3, 1500)):
        rows, _ = kept(problem(upper=ramp.build(1.0, 0.1), accuracy=accuracy))
        assert len(rows.time) < most


def test_rows_that_are_not_yet_accurate_after_an_infinite_stress_are_left_out():
    case = problem(upper=1.0, accuracy=1e-3)
    solved = solve(case)
    errors = solved.run.errors.stress.copy()
    plain = told(case, solved, errors)
    first = int(np.searchsorted(solved.run.history.time, plain.time[1]))
    spoilt = slice(first, first + 5)
    errors[spoilt, 1] = 0.5 * np.abs(solved.run.history.stress[spoilt, 1])  # planted: the first kept rows are far off
    fewer = told(case, solved, errors)
    assert fewer.time[1] == solved.run.history.time[first + 5]


def test_a_coarse_history_is_seen_to_be_coarse():
    """Negative control: every fourth row of the stored ones is not dense enough."""
    rows, solved = kept(problem(upper=ramp.build(1.0, 0.1), accuracy=1e-3))
    thin = Rows(*(getattr(rows, name)[::4] for name in ("time", "stress", "speed", "mean", "gradient")))
    t, line = lines(thin, "stress", 1)
    curve = solved.run.history.stress_curve(1)
    assert np.abs(line - curve.sample(t)).max() > 1e-3 * np.abs(curve.value).max()


# --- profiles
def test_chosen_instants_include_both_ends_and_follow_the_change():
    history = solve(problem(upper=ramp.build(1.0, 0.1))).run.history
    times = profile_times(history, 40)
    assert (times[0], times[-1]) == (0.0, history.time[-1])
    assert len(times) == 40
    assert (np.diff(times) > 0).all()
    # most of the change lies in the first diffusion time
    assert (times < 0.5).sum() > 25


def test_nothing_changes_and_the_instants_are_even():
    history = solve(problem(upper=constant(1.0), start="steady", duration=2.0)).run.history
    times = profile_times(history, 11)
    np.testing.assert_allclose(np.diff(times), np.diff(times)[0], rtol=1e-6)


def test_added_nodes_lie_between_the_march_s_own_and_smooth_profiles_stay_smooth():
    case = problem(push=1.0)
    history = solve(case).run.history
    solved = solve(case)
    cells = len(history.position) - 1
    parts, position = denser(case, solved.ladder.layers, cells)
    np.testing.assert_allclose(position[::parts], history.position, rtol=1e-12, atol=1e-15)
    assert (np.diff(position) > 0).all()
    final = history.profile[-1:]
    dense = between(final, max(parts, 2) if parts > 1 else 1, np.zeros(1, bool))
    if parts > 1:
        np.testing.assert_allclose(dense[0], 0.5 * position * (1.0 - position), atol=1e-4 * 0.125)


def test_a_profile_with_a_layer_of_no_thickness_is_joined_by_straight_lines():
    profile = np.zeros((1, 9))
    profile[0, -1] = 1.0
    out = between(profile, 4, np.ones(1, bool))
    np.testing.assert_allclose(out[0, -5:], [0.0, 0.25, 0.5, 0.75, 1.0])
    assert not out[0, :-5].any()


def test_no_profile_between_nodes_goes_far_beyond_its_neighbours():
    """A smooth maximum lies above its nodes; a rough profile must not be carried away by its polynomial."""
    random = np.random.default_rng(3)
    profile = random.normal(size=(5, 12))
    out = between(profile, 8, np.zeros(5, bool))
    room = 0.25 * np.ptp(profile)
    assert out.max() <= profile.max() + room
    assert out.min() >= profile.min() - room
    x = np.linspace(0.0, 1.0, 9)
    top = between(1.0 - (x - 0.45)[None, :] ** 2, 8, np.zeros(1, bool))
    assert top.max() == pytest.approx(1.0, abs=1e-4)


def test_a_history_that_is_told_to_be_wrong_keeps_its_rows(tmp_path):
    """An error without an infinite stress before it removes nothing: it is reported, not hidden."""
    case = problem(upper=ramp.build(1.0, 0.1), accuracy=1e-3)
    solved = solve(case)
    errors = replace(solved.run.errors, stress=np.ones_like(solved.run.errors.stress))
    rows = told(case, solved, errors.stress)
    assert set(solved.run.history.time) <= set(rows.time)
