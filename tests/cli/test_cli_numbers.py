"""Numbers for reading: the printed bound must hold for the printed value."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from transient.cli.numbers import columns, listed, plain, stated
from transient.result.scale import scale


@pytest.mark.parametrize(
    ("value", "error", "unit", "text"),
    [
        (0.27143, 2.3e-4, "s", "271.43 ± 0.23 ms"),
        (-1.23456789, 1e-9, "Pa", "-1.2346 ± 0.0001 Pa"),
        (12345.6, 12.3, "Pa", "12.346 ± 0.013 kPa"),
        (0.3, 0.2, "s", "300 ± 200 ms"),
        (0.0, 0.0, "Pa", "0 ± 0 Pa"),
        (0.5, None, "Pa", "500 mPa"),
    ],
)
def test_digits_follow_the_error(value, error, unit, text):
    if error is None:
        text = plain(value, unit)
    assert stated(value, error, unit) == text


@given(
    value=st.floats(1e-9, 1e8) | st.floats(-1e8, -1e-9),
    relative=st.floats(1e-12, 0.5),
)
def test_the_printed_interval_contains_the_stated_one(value, relative):
    error = abs(value) * relative
    shown, bound = re.fullmatch(r"(-?[\d.]+) ± ([\d.]+) \S+", stated(value, error, "Pa")).groups()
    factor = scale(value, "Pa").factor
    slack = 1e-9 * abs(value * factor)
    assert float(shown) - float(bound) <= (value - error) * factor + slack
    assert float(shown) + float(bound) >= (value + error) * factor - slack
    # And it is not idly wide: one step of the last of two digits, or of the five digits shown.
    assert float(bound) <= 1.16 * error * factor + 2e-4 * abs(value) * factor


def test_an_angular_speed_reads_in_turns_per_minute():
    # 60 rpm = 2 pi rad/s by definition of the unit.
    assert plain(6.283185307179586, "rad/s") == "60 rpm"


def test_lists_and_columns():
    assert listed(["a"]) == "a"
    assert listed(["a", "b", "c"]) == "a, b and c"
    assert list(columns([["a", "bb"], ["ccc", "d"]])) == ["a     bb", "ccc   d"]
