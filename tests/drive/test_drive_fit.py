"""A Python function fitted by cubic pieces: the tolerance holds, jumps stay jumps, the impossible is refused."""

from __future__ import annotations

import math

import numpy as np
import pytest

from transient.drive.fit import fit
from transient.drive.pieces import DriveError

FUNCTIONS = {
    "sine": lambda t: math.sin(5 * t),
    "fast lag": lambda t: 1 - math.exp(-t / 1e-3),
    "kink": lambda t: abs(t - 0.3),
    "root": lambda t: math.sqrt(t),
    "jump": lambda t: 1.0 if t >= 0.3 else 0.0,
    "jump at a first edge": lambda t: t + (1.0 if t >= 1.0 else 0.0),
    "stairs": lambda t: math.floor(7.3 * t) + math.sin(t),
    "constant": lambda t: 2.0,
}


@pytest.mark.parametrize("tolerance", [1e-3, 1e-6])
@pytest.mark.parametrize("function", FUNCTIONS.values(), ids=FUNCTIONS)
def test_the_tolerance_holds(function, tolerance) -> None:
    pieces = fit(function, 2.0, tolerance).pieces(3.0)
    t = np.random.default_rng(0).uniform(0.0, 2.0, 5000)
    error = np.abs(pieces.value(t) - [function(x) for x in t])
    assert error.max() <= tolerance
    assert pieces.value(np.array([2.5])) == pytest.approx([function(2.0)])


def test_an_error_in_the_function_is_noticed() -> None:
    pieces = fit(lambda t: math.sin(5 * t) + 2e-6, 2.0, 1e-6).pieces(3.0)
    t = np.linspace(0.0, 2.0, 500)
    assert np.abs(pieces.value(t) - np.sin(5 * t)).max() > 1e-6


@pytest.mark.parametrize("function", [lambda t: float(t >= 0.3), lambda t: float(t > 0.3)])
def test_a_jump_is_found_where_it_is(function) -> None:
    pieces = fit(function, 1.0, 1e-6).pieces(2.0)
    jump = pieces.jumps()
    assert pieces.starts[jump != 0.0] == pytest.approx([0.3], rel=1e-15)
    assert jump[jump != 0.0] == pytest.approx([1.0], rel=1e-12)


def test_a_smooth_function_gets_no_jump_and_hardly_a_kink() -> None:
    pieces = fit(math.sin, 10.0, 1e-6).pieces(10.0)
    assert not pieces.jumps()[1:].any()
    assert (pieces.jumps(1)[1:] != 0.0).sum() <= len(pieces.starts) / 20


def test_pieces_grow_like_the_fourth_root_of_the_accuracy() -> None:
    counts = [len(fit(lambda t: math.sin(9 * t), 2.0, tol).breaks(2.0)) for tol in (1e-6, 1e-10)]
    # Cubic interpolation is of fourth order (any text on approximation), halving makes it a factor of 2 at most.
    assert counts[1] / counts[0] == pytest.approx(10.0, rel=1.0)
    assert counts[1] / counts[0] > 5.0


@pytest.mark.parametrize(
    ("function", "words"),
    [
        (lambda t: math.tan(3 * t), "out of reach"),
        (lambda t: math.sin(1 / (t + 1e-9)), "out of reach"),
        (lambda t: math.nan if t > 0.5 else 0.0, "no finite value"),
        (lambda t: math.sqrt(t) * 1e6, "out of reach near t = 0 s"),
    ],
)
def test_what_cannot_be_fitted_is_refused(function, words) -> None:
    with pytest.raises(DriveError, match=words):
        fit(function, 1.0, 1e-6)


def test_before_and_after() -> None:
    drive = fit(lambda t: 1.0 + t, 1.0, 1e-6, before=0.5)
    assert drive.before == 0.5
    assert drive.eventual.since == 1.0
    assert drive.eventual.drive.before == pytest.approx(2.0)
