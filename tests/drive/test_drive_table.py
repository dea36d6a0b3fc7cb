"""Tables: what is refused and with which row, and the monotone cubic."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from transient.drive import KINDS
from transient.drive.pieces import DriveError

table = KINDS["table"].build


@pytest.mark.parametrize(
    ("keys", "key", "words"),
    [
        ({"times": [0.0, 1.0], "values": [1.0]}, "values", "2 times and 1 values"),
        ({"times": [], "values": []}, "times", "at least 1"),
        ({"times": [1.0], "values": [1.0], "interpolation": "smooth"}, "times", "at least 2"),
        ({"times": [0.0, math.nan, 1.0], "values": [1.0, 2.0, 3.0]}, "times", "row 2"),
        ({"times": [0.0, 0.5, 1.0], "values": [1.0, 2.0, math.inf]}, "values", "row 3"),
        ({"times": [-0.5, 1.0], "values": [1.0, 2.0]}, "times", "row 1 has the time -0.5 s"),
        ({"times": [0.0, 1.0, 0.5], "values": [1.0, 2.0, 3.0]}, "times", "row 3 goes back in time"),
        ({"times": [0.0, 1.0, 1.0, 1.0], "values": [1.0, 2.0, 3.0, 4.0]}, "times", "rows 2 to 4 share one time"),
        ({"times": [0.0, 1.0], "values": [1.0, 2.0], "interpolation": "cubic"}, "interpolation", "linear, smooth"),
    ],
)
def test_bad_rows_are_refused(keys, key, words) -> None:
    with pytest.raises(DriveError, match=words) as refusal:
        table(**keys)
    assert refusal.value.key == key


def test_smooth_table_equals_the_reference_library() -> None:
    rng = np.random.default_rng(3)
    t = np.sort(rng.uniform(0.0, 9.0, 300))
    v = np.cumsum(rng.normal(size=300))
    at = rng.uniform(t[0], t[-1], 4000)
    pieces = table(times=t, values=v, interpolation="smooth").pieces(9.0)
    assert pieces.value(at) == pytest.approx(PchipInterpolator(t, v)(at), abs=1e-11, rel=0)
    assert not pieces.jumps(1)[2:-1].any()


def test_smooth_table_is_built_afresh_after_a_jump() -> None:
    t = np.array([0.0, 0.5, 1.0, 1.0, 1.5, 2.5])
    v = np.array([0.0, 1.0, 1.5, 5.0, 4.0, 1.0])
    pieces = table(times=t, values=v, interpolation="smooth").pieces(3.0)
    early, late = np.linspace(0.0, 1.0, 20, endpoint=False), np.linspace(1.0, 2.5, 20)
    assert pieces.value(early) == pytest.approx(PchipInterpolator(t[:3], v[:3])(early), abs=1e-13)
    assert pieces.value(late) == pytest.approx(PchipInterpolator(t[3:], v[3:])(late), abs=1e-13)
    assert pieces.starts[pieces.jumps() != 0.0].tolist() == [1.0]


def test_smooth_table_overshoots_nowhere() -> None:
    t, v = np.array([0.0, 1.0, 1.1, 5.0, 6.0]), np.array([0.0, 0.0, 1.0, 1.0, 0.2])
    value = table(times=t, values=v, interpolation="smooth").pieces(8.0).value(np.linspace(0.0, 8.0, 4001))
    assert value.min() >= 0.0
    assert value.max() <= 1.0 + 1e-15
    assert value[-1] == 0.2


@pytest.mark.parametrize("interpolation", ["linear", "smooth"])
def test_ten_thousand_rows_make_as_many_pieces(interpolation) -> None:
    t = np.arange(10_000) * 1e-3
    v = np.random.default_rng(1).normal(size=10_000)
    drive = table(times=t, values=v, interpolation=interpolation)
    pieces = drive.pieces(20.0)
    assert len(pieces.starts) == 10_000
    assert pieces.value(t) == pytest.approx(v, abs=1e-10)
    repeated = KINDS["repeat"].build(part=drive, every=10.0).pieces(100.0)
    assert repeated.value(t[1:] + 90.0) == pytest.approx(v[1:], abs=1e-8)
