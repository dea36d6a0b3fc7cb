"""Rainflow counts: ASTM E1049-85, sections 5.4.4 and 5.4.5 (worked example), and the package that implements 5.4.4."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest
from pulses import forced, measured
from rainflow import extract_cycles

from transient.loads.cycles import cycles
from transient.loads.extrema import extrema, reversals
from transient.loads.history import Infinite, LoadHistory

EXAMPLE = np.array([-2.0, 1.0, -3.0, 5.0, -1.0, 3.0, -4.0, 4.0, -2.0])
# (range, mean, count) of section 5.4.4's figure 6.
COUNTED = [(9, 0.5, 0.5), (8, 0, 0.5), (8, 1, 0.5), (6, 1, 0.5), (4, -1, 0.5), (4, 1, 1), (3, -0.5, 0.5)]


def by_range(counted):
    out = Counter()
    for extent, _, count in counted:
        out[extent] += count
    return {extent: count for extent, count in out.items() if count}


def test_the_standards_example_through_the_whole_path(capsys, tmp_path):
    said = measured(capsys, tmp_path, forced(np.arange(9.0), EXAMPLE), "--cycles")
    assert said["cycles"] == [list(cycle) for cycle in COUNTED]
    assert by_range(said["cycles"]) == {3: 0.5, 4: 1.5, 6: 0.5, 8: 1.0, 9: 0.5}


def test_straight_lines_between_the_turns_count_nothing_more():
    time = np.linspace(0.0, 8.0, 801)
    assert cycles(np.interp(time, np.arange(9.0), EXAMPLE)) == COUNTED


def test_each_repeat_adds_the_cycles_of_a_repeating_history(capsys, tmp_path):
    """Section 5.4.5: counted from its largest turn, one cycle each of 9, 7, 4 and 3 (from memory)."""
    result = forced(np.arange(9.0), EXAMPLE)
    once, often = (measured(capsys, tmp_path, result, "--repeat", n)["cycles"] for n in ("1", "1001"))
    added = Counter(by_range(often))
    added.subtract(by_range(once))
    assert {extent: count / 1000 for extent, count in added.items() if count} == {9: 1, 7: 1, 4: 1, 3: 1}


@pytest.mark.parametrize("seed", range(20))
def test_repeats_are_those_of_the_history_written_out(seed):
    rng = np.random.default_rng(seed)
    values = rng.integers(-4, 5, int(rng.integers(2, 14))).astype(float)
    if np.ptp(values) == 0.0:
        values[0] += 1.0
    for repeat in (1, 2, 3, 7):
        written = Counter()
        for extent, mean, count, *_ in extract_cycles([*np.tile(values, repeat), values[-1]]):
            if extent:
                written[extent, mean] += count
        assert {(extent, mean): count for extent, mean, count in cycles(values, repeat)} == dict(written)


def test_a_turn_left_out_is_noticed():
    """The planted error: without its 3 the example has another count."""
    assert by_range(cycles(np.delete(EXAMPLE, 5))) != by_range(COUNTED)


def test_one_way_loads_and_none():
    assert cycles(np.array([0.0, 2.0, 5.0])) == [(5.0, 2.5, 0.5)]
    assert cycles(np.array([0.0, 5.0])) == [(5.0, 2.5, 0.5)]
    assert cycles(np.full(7, 3.0)) == []
    # A start and a stop, a thousand times: each return to rest closes the cycle.
    assert sum(count for *_, count in cycles(np.array([0.0, 5.0, 0.0]), 1000)) == 1000.0


def test_turns_are_the_first_rows_of_plateaus_and_no_round_off():
    values = np.array([0.0, 0.0, 2.0, 2.0, 2.0, 1.0, 1.0 + 1e-14, 1.0, 3.0, 3.0])
    assert reversals(values).tolist() == [0, 2, 5, 8]


def test_extrema_name_what_they_are():
    history = LoadHistory(np.arange(5.0), np.array([0.0, 2.0, -1.0, 0.5, 0.5]))
    assert extrema(history) == [
        (0.0, 0.0, "start"), (1.0, 2.0, "maximum"), (2.0, -1.0, "minimum"), (3.0, 0.5, "end"),
    ]  # fmt: skip


def test_an_infinite_instant_is_an_extreme_and_the_row_after_it_none():
    infinite = Infinite(1, 1.0, -2.0, 0.5, 0.0)
    history = LoadHistory(np.array([0.0, 1.0, 1.01, 2.0]), np.array([0.5, 0.5, -20.0, -2.0]), (infinite,))
    assert extrema(history) == [(0.0, 0.5, "start"), (1.0, None, "infinite"), (2.0, -2.0, "end")]
