"""Every history kind against its definition, before, at, and between its breaks."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from plain_histories import compiled, magnitude, plain
from random_histories import histories

from transient.drive import KINDS
from transient.drive.pieces import Drive, DriveError, Pieces, constant

UNTIL = 6.0
few = settings(max_examples=120, deadline=None, derandomize=True)
moments = st.lists(st.floats(0.0, UNTIL, exclude_max=True), min_size=1, max_size=12)


def assert_same(pieces: Pieces, history, times) -> None:
    """Pieces equal the definition at ``times``, and at every break from both sides."""
    close = 1e-9 * (magnitude(history) + 1e-3)
    times = np.concatenate([times, pieces.starts])
    wanted = [plain(history, float(t)) for t in times]
    # A time within round-off of a break may fall on either side of it: there the break itself is tested instead.
    near = np.array([np.any((np.abs(t - pieces.starts) < 1e-9) & (t != pieces.starts)) for t in times])
    assert pieces.value(times)[~near] == pytest.approx(np.array(wanted)[~near], abs=close, rel=0)
    ends = pieces.starts[1:]
    left = pieces.at(np.arange(len(ends)), np.diff(pieces.starts))
    assert left == pytest.approx([plain(history, math.nextafter(t, 0.0)) for t in ends], abs=close, rel=0)
    assert pieces.before == pytest.approx(plain(history, -1e-9), abs=close, rel=0)


@few
@given(histories, moments)
def test_pieces_equal_the_definition(history, times) -> None:
    assert_same(compiled(history).pieces(UNTIL), history, times)


def test_a_planted_error_is_noticed() -> None:
    history = ("smooth_ramp", {"to": 2.0, "over": 1.0, "at": 0.5})
    right = compiled(history).pieces(UNTIL)
    wrong = Pieces(right.starts, right.poly, right.coeff, right.rate * (1 + 1e-7), right.before)
    assert_same(right, history, [0.7])
    with pytest.raises(AssertionError):
        assert_same(wrong, history, [0.7])


@few
@given(histories, moments)
def test_what_a_drive_ends_in_is_what_it_becomes(history, times) -> None:
    drive = compiled(history)
    end = drive.eventual
    assume(end.drive is not None)
    since = end.since if math.isfinite(end.since) else 60.0
    later = since + 1e-6 + np.array(times)
    close = 1e-9 * (magnitude(history) + 1e-3)
    after = drive.pieces(since + 2 * UNTIL).value(later)
    regime = end.drive.pieces(since + 2 * UNTIL + (end.period or 0.0))
    assert _off_breaks(after, regime.value(later), later, regime.starts) <= close
    shifted = regime.value(later + end.period) if end.period else np.full_like(later, regime.value(np.zeros(1))[0])
    assert _off_breaks(after, shifted, later, regime.starts) <= close


def _off_breaks(one: np.ndarray, other: np.ndarray, times: np.ndarray, breaks: np.ndarray) -> float:
    """Largest difference, away from breaks, where round-off of a period decides on which side a time lies."""
    away = np.abs(times[:, None] - breaks).min(axis=1) > 1e-7
    return np.abs(one - other)[away].max(initial=0.0)


def test_the_registry_names_each_kind_of_the_contract() -> None:
    assert list(KINDS) == [
        "step", "ramp", "smooth_ramp", "s_curve", "trapezoid", "lag", "sine", "half_sine", "table", "sum", "repeat",
    ]  # fmt: skip
    for name, kind in KINDS.items():
        assert kind.name == name
        assert kind.doc
        assert all(field.doc and not (field.required and field.default is not None) for field in kind.fields)


def test_lag_at_whole_time_constants() -> None:
    # Rounded shares of a first-order response, as printed in textbooks of control: common practice, no source.
    drive = KINDS["lag"].build(to=1.0, time_constant=0.2, at=0.3)
    shares = drive.pieces(2.0).value(0.3 + 0.2 * np.arange(1, 6))
    assert shares.round(3).tolist() == [0.632, 0.865, 0.950, 0.982, 0.993]


@pytest.mark.parametrize(("gees", "duration", "change"), [(15, 11e-3, 1.0), (30, 18e-3, 3.4), (100, 6e-3, 3.7)])
def test_half_sine_gives_the_speed_change_of_a_shock_test(gees, duration, change) -> None:
    # IEC 60068-2-27, table of half-sine severities (from memory): velocity change in m/s to one decimal.
    pulse = KINDS["half_sine"].build(amplitude=9.81 * gees, over=duration, at=1.0)
    assert round(float(pulse.integral(np.array(2.0))), 1) == change


def test_s_curve_keeps_its_limits() -> None:
    pieces = KINDS["s_curve"].build(to=-3.0, acceleration=2.0, jerk=8.0, from_=1.0, at=0.5).pieces(9.0)
    t = np.linspace(0.0, 9.0, 4001)
    assert np.abs(pieces.value(t, 1)).max() == pytest.approx(2.0, rel=1e-12)
    assert set(np.abs(pieces.value(t, 2)).round(12)) == {0.0, 8.0}
    # The change takes change/acceleration + acceleration/jerk: common practice of motion control, no source.
    assert pieces.starts[-1] == pytest.approx(0.5 + 4.0 / 2.0 + 2.0 / 8.0, rel=1e-12)


def test_sine_keeps_its_phase_after_a_late_start() -> None:
    drive = KINDS["sine"].build(amplitude=1.0, frequency=50.0, at=1e4)
    t = 1e4 + np.linspace(0.0, 0.02, 41)
    wanted = np.sin(2 * np.pi * 50.0 * (t - 1e4))
    assert drive.pieces(2e4).value(t) == pytest.approx(wanted, abs=1e-12)
    assert drive.eventual.drive.pieces(2e4).value(t) == pytest.approx(wanted, abs=1e-8)


BAD = [
    ("step", {"to": 1.0, "at": -0.1}, "at", "t = 0"),
    ("step", {"to": math.nan}, "to", "finite"),
    ("ramp", {"to": 1.0, "over": 0.0}, "over", "above zero"),
    ("ramp", {"to": 1.0, "over": 1e-14, "at": 1.0}, "over", "jump"),
    ("ramp", {"to": 1.0, "over": 1.0, "from_": math.inf}, "from", "finite"),
    ("s_curve", {"to": 1.0, "acceleration": -1.0, "jerk": 1.0}, "acceleration", "above zero"),
    ("trapezoid", {"to": 1.0, "rise": -1.0, "hold": 1.0, "fall": 1.0}, "rise", "negative"),
    ("trapezoid", {"to": 1.0, "rise": 0.0, "hold": 0.0, "fall": 0.0}, "hold", "nothing"),
    ("lag", {"to": 1.0, "time_constant": 0.0}, "time_constant", "above zero"),
    ("sine", {"amplitude": 1.0}, "frequency", "exactly one"),
    ("sine", {"amplitude": 1.0, "frequency": 1.0, "period": 1.0}, "period", "exactly one"),
    ("sine", {"amplitude": 1.0, "frequency": -1.0}, "frequency", "above zero"),
    ("half_sine", {"amplitude": 1.0, "over": -1.0}, "over", "above zero"),
    ("sum", {"parts": []}, "parts", "at least one"),
    ("repeat", {"part": constant(1.0), "every": 0.0}, "every", "above zero"),
    ("repeat", {"part": constant(1.0), "every": 1.0, "times": 0}, "times", "whole number"),
    ("repeat", {"part": constant(1.0), "every": 1.0, "times": 1.5}, "times", "whole number"),
]


@pytest.mark.parametrize(("name", "keys", "key", "words"), BAD)
def test_contradictions_are_refused_with_the_key(name, keys, key, words) -> None:
    with pytest.raises(DriveError, match=words) as refusal:
        KINDS[name].build(**keys)
    assert refusal.value.key == key


@pytest.mark.parametrize(
    ("history", "before", "first"),
    [
        (("step", {"to": 2.0, "from": 1.0}), 1.0, 2.0),
        (("lag", {"to": 2.0, "from": 1.0, "time_constant": 1.0}), 1.0, 1.0),
        (("sine", {"amplitude": 2.0, "mean": 0.5, "period": 1.0, "phase": math.pi / 2}), 0.5, 2.5),
        (("table", {"times": [0.0, 0.0, 1.0], "values": [3.0, 4.0, 5.0]}), 3.0, 4.0),
        (("table", {"times": [0.5], "values": [3.0]}), 3.0, 3.0),
        (("half_sine", {"amplitude": 1.0, "over": 1.0}), 0.0, 0.0),
    ],
)
def test_value_before_the_start_and_just_after(history, before, first) -> None:
    drive: Drive = compiled(history)
    pieces = drive.pieces(1.0)
    assert drive.before == pieces.before == before
    assert pieces.value(np.array([-1.0, 0.0])) == pytest.approx([before, first], rel=1e-15)
    assert pieces.jumps()[0] == pytest.approx(first - before)
