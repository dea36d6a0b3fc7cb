"""Pieces as such: restarts, round-off at breaks, cycles, sums, and what they cost in pieces."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from plain_histories import compiled, magnitude
from random_histories import histories

from transient.drive import KINDS
from transient.drive.pieces import Drive, DriveError, constant, total
from transient.drive.piecewise import Pieces
from transient.drive.times import common_period, merge_times

UNTIL = 6.0
few = settings(max_examples=80, deadline=None, derandomize=True)
build = {name: kind.build for name, kind in KINDS.items()}


def kinks(drive: Drive, until: float, order: int) -> np.ndarray:
    """Times in (0, until) at which the ``order``-th derivative jumps."""
    pieces = drive.pieces(until)
    return pieces.starts[1:][pieces.jumps(order)[1:] != 0.0]


@few
@given(histories, st.lists(st.floats(0.0, UNTIL, exclude_max=True), min_size=1, max_size=12))
def test_a_restart_changes_nothing_and_adds_no_jump(history, cuts) -> None:
    own = compiled(history).pieces(UNTIL)
    again = own.restart(merge_times([own.starts, np.array(cuts)]))
    t = np.linspace(0.0, UNTIL, 97)[:-1] + 1e-4
    close = 1e-11 * (magnitude(history) + 1e-3)
    assert again.value(t) == pytest.approx(own.value(t), abs=close, rel=0)
    added = ~np.isin(again.starts, own.starts)
    for order in range(3):
        assert not again.jumps(order)[added].any()


@few
@given(histories)
def test_scaling_and_difference_are_linear(history) -> None:
    drive = compiled(history)
    t = np.linspace(0.0, UNTIL, 97)[:-1] + 1e-4
    close = 1e-12 * (magnitude(history) + 1e-3)
    zero = drive.scaled(3.0).minus(total([drive, drive.scaled(2.0)]))
    assert np.abs(zero.pieces(UNTIL).value(t)).max() <= 4 * close
    assert np.abs(zero.before) <= close


def test_jumps_and_kinks_of_a_late_repeat_are_real_ones() -> None:
    # The rise is 1e-3 of a cycle, its times inexact in binary: after 3000 cycles time itself carries round-off.
    part = build["trapezoid"](to=0.3, rise=1e-3, hold=0.3, fall=1e-3, at=0.1)
    drive = build["repeat"](part=part, every=0.7)
    assert len(kinks(drive, 2100.0, 0)) == 0
    assert len(kinks(drive, 2100.0, 1)) == 4 * 3000
    steps = build["repeat"](part=build["step"](to=0.3, at=0.1), every=0.7)
    pieces = steps.pieces(2100.0)
    assert np.abs(pieces.jumps()[1:]) == pytest.approx(np.full(len(pieces.starts) - 1, 0.3), rel=1e-15)


def test_round_off_makes_no_jump_where_parts_meet() -> None:
    rise = build["ramp"](to=1.0, over=0.1 + 0.2)
    back = build["ramp"](to=-1.0, over=0.3, at=0.3)
    drive = build["sum"](parts=[rise, back])
    assert len(drive.breaks(9.0)) == 3
    assert kinks(drive, 9.0, 0).tolist() == []
    assert kinks(drive, 9.0, 1) == pytest.approx([0.3, 0.6], rel=1e-12)


def test_a_break_of_another_part_may_stand_for_that_of_a_fast_cycle() -> None:
    # In a run of 10^4 cycles breaks 0.9e-11 of a cycle apart are one, and the earlier of them is kept.
    fast = build["repeat"](part=build["step"](to=1.0, at=0.5e-6), every=1e-6)
    pieces = total([fast, build["step"](to=10.0, at=5e-6 - 0.9e-17)]).pieces(1e-2)
    assert pieces.value(np.array([4.75e-6, 5.25e-6, 5.75e-6])).tolist() == [1.0, 10.0, 11.0]


def test_half_cosine_has_no_kink_at_its_ends() -> None:
    drive = build["smooth_ramp"](to=7.0, over=0.3, at=0.7)
    assert kinks(drive, 9.0, 1).tolist() == []
    assert kinks(drive, 9.0, 2) == pytest.approx([0.7, 1.0], rel=1e-12)


def test_small_kinks_are_kept() -> None:
    drive = build["table"](times=[0.0, 1.0, 2.0], values=[1.0, 2.0, 3.0 + 1e-9])
    assert kinks(drive, 9.0, 1) == pytest.approx([1.0, 2.0])


def test_rows_on_one_line_are_no_breaks() -> None:
    t = np.concatenate([np.linspace(0.0, 0.1, 1001), np.linspace(0.1, 0.7, 500)[1:]])
    drive = build["table"](times=t, values=0.3 * np.minimum(t, 0.1) / 0.1)
    assert len(drive.breaks(9.0)) == 2
    assert drive.eventual.since == pytest.approx(0.1)


def test_slow_bends_are_kept_although_each_is_small() -> None:
    t = np.linspace(0.0, 1.0, 200_001)
    v = 1e3 + 1e-4 * t**2
    assert np.abs(build["table"](times=t, values=v).pieces(1.0).value(t) - v).max() <= 1e-11


def test_whole_sine_waves_repeat_without_seams() -> None:
    wave = build["sine"](amplitude=1.0, frequency=3.0, phase=0.4)
    drive = build["repeat"](part=wave, every=1.0)
    assert len(drive.breaks(1e3)) == 1
    assert len(build["repeat"](part=wave, every=0.9).breaks(9.0)) == 10


def test_a_cycle_that_ends_as_it_begins_has_no_seam() -> None:
    part = build["half_sine"](amplitude=1.0, over=0.25, at=0.5)
    drive = build["repeat"](part=part, every=1.0)
    assert drive.breaks(3.0).tolist() == [0.0, 0.5, 0.75, 1.5, 1.75, 2.5, 2.75]
    assert drive.pieces(3.0).value(np.array([1.0, 1.25, 1.625, 2.0])) == pytest.approx([0, 0, 1, 0], abs=1e-15)


def test_a_part_that_ends_with_the_cycle_leaves_no_sliver() -> None:
    part = build["ramp"](to=1.0, over=0.3)
    drive = build["repeat"](part=part, every=0.1 + 0.2, times=2)
    assert drive.breaks(9.0) == pytest.approx([0.0, 0.3, 0.6], rel=1e-12)
    assert drive.pieces(9.0).value(np.array([5.0])) == pytest.approx([1.0])


def test_a_jump_at_the_end_of_the_cycle_belongs_to_none() -> None:
    part = build["step"](to=1.0, at=0.3)
    drive = build["repeat"](part=part, every=0.1 + 0.2, times=2)
    assert not drive.pieces(9.0).value(np.linspace(0.0, 9.0, 91)).any()


def test_a_restart_where_slope_and_curvature_vanish_makes_no_kink() -> None:
    # 2 + (x - 1)^3: near x = 1 the slope is what round-off leaves of terms of order 1.
    none = np.zeros((1, 0), complex)
    own = Pieces(np.zeros(1), np.array([[1.0, 3.0, -3.0, 1.0]]), none, none, 1.0)
    away = np.geomspace(1e-6, 0.9, 40)
    again = own.restart(np.sort(np.concatenate([[0.0, 1.0], 1.0 - away, 1.0 + away])))
    assert not again.jumps(1)[1:].any()


def test_repeats_of_repeats() -> None:
    inner = build["repeat"](part=build["step"](to=1.0, at=0.125), every=0.25, times=2)
    drive = build["repeat"](part=inner, every=1.0)
    t = np.array([0.0, 0.125, 0.25, 0.375, 0.5, 0.875, 1.0, 1.125, 7.125])
    assert drive.pieces(9.0).value(t).tolist() == [0, 1, 0, 1, 1, 1, 0, 1, 1]
    assert drive.eventual.period == 1.0


def test_more_pieces_than_a_run_can_hold_are_refused() -> None:
    drive = build["repeat"](part=build["step"](to=1.0, at=1e-7), every=2e-7)
    with pytest.raises(DriveError, match="shorten the run or lengthen the cycle"):
        drive.breaks(1e3)


def test_close_times_are_one_but_a_crowd_of_them_is_not() -> None:
    assert merge_times([np.array([0.0, 0.3]), np.array([0.1 + 0.2, 1.0])]).tolist() == [0.0, 0.3, 1.0]
    crowd = 1.0 + 0.7e-12 * np.arange(10)
    kept = merge_times([crowd])
    assert np.diff(kept).min() > 1e-12
    assert np.abs(crowd[:, None] - kept).min(axis=1).max() <= 1e-12


@pytest.mark.parametrize(
    ("periods", "common"),
    [
        ([0.2, 0.3], 0.6),
        ([1 / 50, 1 / 60], 0.1),
        ([1.0, None, 2.5], 5.0),
        ([1.0, 2**0.5], None),
        ([1.0, 1 / 1500], None),
        ([1.0, 997 / 991, 983 / 977], None),
    ],
)
def test_common_period(periods, common) -> None:
    found, exists = common_period(periods)
    assert exists == (common is not None)
    assert found == pytest.approx(common, rel=1e-12) if exists else found is None


def test_sums_end_in_what_their_parts_end_in() -> None:
    sine = build["sine"](amplitude=1.0, period=0.2)
    other = build["sine"](amplitude=1.0, period=0.3, at=0.5)
    lag = build["lag"](to=2.0, time_constant=0.1)
    both = total([sine, other]).eventual
    assert both.period == pytest.approx(0.6)
    assert both.since == 0.5
    assert total([sine, lag]).eventual.since == np.inf
    assert total([constant(1.0), build["ramp"](to=2.0, over=1.0)]).eventual.period is None
    assert total([sine, build["sine"](amplitude=1.0, period=0.2 * 2**0.5)]).eventual.drive is None
    assert total([constant(1.0), sine]).eventual.drive is not None


def test_before_the_start_a_sum_and_a_repeat_follow_their_parts() -> None:
    ramp = build["ramp"](to=2.0, from_=1.0, over=0.5)
    assert total([ramp, constant(3.0, before=0.0), constant(4.0)]).before == 5.0
    assert build["repeat"](part=ramp, every=1.0).before == 1.0
