"""Rates of change and integrals of drives, against each other and against quadrature."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from plain_histories import compiled, magnitude, plain
from random_histories import histories
from scipy.integrate import quad

from transient.drive import KINDS
from transient.drive.pieces import DriveError, constant, total

UNTIL = 6.0
few = settings(max_examples=80, deadline=None, derandomize=True)
build = {name: kind.build for name, kind in KINDS.items()}


@few
@given(histories)
def test_integral_on_pieces_equals_integral_by_cycles(history) -> None:
    drive = compiled(history)
    t = np.linspace(-1.0, UNTIL, 57)
    wanted = drive.pieces(UNTIL).integral(t)
    assert drive.integral(t) == pytest.approx(wanted, abs=1e-10 * (magnitude(history) + 1e-3), rel=0)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(histories)
def test_integral_equals_quadrature_of_the_definition(history) -> None:
    drive = compiled(history)
    until = 2.0
    breaks = np.append(drive.breaks(until), until)
    wanted = sum(
        quad(lambda t: plain(history, t), a, b, epsabs=1e-10, limit=200)[0]
        for a, b in zip(breaks[:-1], np.nextafter(breaks[1:], 0.0), strict=True)
    )
    assert float(drive.integral(np.array(until))) == pytest.approx(wanted, abs=1e-8 * (magnitude(history) + 1e-3))


@few
@given(histories)
def test_integral_of_the_rate_is_the_change(history) -> None:
    drive = compiled(history)
    try:
        rate = drive.derivative()
    except DriveError:
        assert drive.pieces(60.0).jumps().any()
        return
    t = np.linspace(0.0, UNTIL, 49)
    change = drive.pieces(2 * UNTIL).value(t) - drive.before
    assert rate.integral(t) == pytest.approx(change, abs=1e-9 * (magnitude(history) + 1e-3), rel=0)
    assert rate.before == 0.0
    end = rate.eventual
    assume(end.drive is not None and math.isfinite(end.since))
    later = end.since + 1e-6 + t
    away = np.abs(later[:, None] - end.drive.breaks(end.since + 9.0)).min(axis=1) > 1e-7
    wanted = rate.pieces(end.since + 9.0).value(later)[away]
    close = 1e-8 * (np.abs(wanted).max(initial=0.0) + magnitude(history) + 1e-3)
    assert end.drive.pieces(end.since + 9.0).value(later)[away] == pytest.approx(wanted, abs=close, rel=0)


def test_rate_of_a_sine() -> None:
    rate = build["sine"](amplitude=2.0, period=0.5, mean=1.0).derivative()
    t = np.linspace(0.0, 3.0, 61)
    assert rate.pieces(3.0).value(t) == pytest.approx(8.0 * math.pi * np.cos(4.0 * math.pi * t), abs=1e-11)
    assert rate.eventual.drive is rate
    assert rate.eventual.period == 0.5


@pytest.mark.parametrize(
    ("drive", "time"),
    [
        (constant(1.0, before=0.0), "0 s"),
        (build["step"](to=1.0, at=0.25), "0.25 s"),
        (build["table"](times=[0.0, 0.5, 0.5, 1.0], values=[0.0, 1.0, 2.0, 2.0]), "0.5 s"),
        (build["repeat"](part=build["ramp"](to=1.0, over=0.75), every=0.75), "0.75 s"),
        (build["repeat"](part=build["step"](to=1.0, at=0.5), every=0.75), "0.5 s"),
        (build["sine"](amplitude=1.0, period=1.0, phase=1.0), "0 s"),
        (total([build["ramp"](to=1.0, over=2.0), build["step"](to=1e-6, at=1.5)]), "1.5 s"),
    ],
)
def test_a_jump_has_no_rate(drive, time) -> None:
    with pytest.raises(DriveError, match=f"jumps at t = {time}"):
        drive.derivative()


def test_jumps_that_cancel_are_none() -> None:
    # 1 - cos: how a displacement that starts from rest at its end of travel is put together.
    cosine = build["sine"](amplitude=-0.3, period=0.7, phase=math.pi / 2)
    rate = total([cosine, build["step"](to=0.3)]).derivative()
    t = np.linspace(0.0, 3.0, 31)
    w = 2.0 * math.pi / 0.7
    assert rate.pieces(3.0).value(t) == pytest.approx(0.3 * w * np.sin(w * t), abs=1e-12)


def test_one_cycle_alone_may_end_away_from_its_beginning() -> None:
    once = build["repeat"](part=build["ramp"](to=1.0, over=0.75), every=0.75, times=1)
    assert once.derivative().pieces(2.0).value(np.array([0.5, 1.0])) == pytest.approx([1 / 0.75, 0.0])
