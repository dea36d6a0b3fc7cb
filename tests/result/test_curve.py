"""Extremes, crossings and integrals of piecewise cubics against numpy's polynomials and scipy's interpolant.

Reference: ``scipy.interpolate.CubicHermiteSpline`` and ``numpy.polynomial`` roots of every interval.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import CubicHermiteSpline

from transient.result.curve import Curve

SEEDS = st.integers(0, 2**32 - 1)
FEW = settings(max_examples=60, deadline=None)


def drawn(seed: int, rows: int = 9, breaks: bool = False) -> Curve:
    """A random curve; with ``breaks`` some rows share their time and the value jumps there."""
    random = np.random.default_rng(seed)
    step = random.uniform(0.1, 2.0, rows - 1)
    if breaks:
        step[random.random(rows - 1) < 0.2] = 0.0
    time = np.concatenate([[0.0], np.cumsum(step)])
    return Curve(time, random.normal(size=rows), 3.0 * random.normal(size=rows), step)


def pieces(curve: Curve):
    """(start, length, Polynomial in the local time) of every interval that has a length."""
    for i in np.flatnonzero(curve.step > 0):
        x = np.array([0.0, curve.step[i]])
        spline = CubicHermiteSpline(x, curve.value[i : i + 2], curve.rate[i : i + 2])
        yield curve.time[i], curve.step[i], np.polynomial.Polynomial(spline.c[::-1, 0])


def inside(roots: np.ndarray, length: float) -> np.ndarray:
    real = roots.real[np.abs(roots.imag) < 1e-9]
    return real[(real > 0) & (real < length)]


@FEW
@given(SEEDS)
def test_values_between_rows_are_those_of_scipy_s_hermite_spline(seed):
    curve = drawn(seed)
    spline = CubicHermiteSpline(curve.time, curve.value, curve.rate)
    t = np.linspace(0.0, curve.time[-1], 203)
    np.testing.assert_allclose(curve.sample(t), spline(t), atol=1e-12 * np.abs(spline(t)).max())


@FEW
@given(SEEDS, st.booleans(), st.sampled_from([1.0, -1.0]))
def test_extremes(seed, breaks, sign):
    curve = drawn(seed, breaks=breaks)
    best = (sign * curve.value).max()
    for _, length, poly in pieces(curve):
        best = max(best, *(sign * poly(x) for x in inside(poly.deriv().roots(), length)), -np.inf)
    value, time = curve.extreme(sign)
    assert sign * value == pytest.approx(best, rel=1e-12, abs=1e-13)
    assert min(abs(curve.time - time)) == 0.0 or curve.sample(np.array([time]))[0] == pytest.approx(value, rel=1e-9)


@FEW
@given(SEEDS, st.booleans())
def test_the_largest_magnitude_keeps_its_sign(seed, breaks):
    curve = drawn(seed, breaks=breaks)
    high, low = curve.extreme(1.0), curve.extreme(-1.0)
    value, _ = curve.magnitude()
    assert abs(value) == max(abs(high[0]), abs(low[0]))
    assert value in (high[0], low[0])


@FEW
@given(SEEDS, st.floats(0.05, 0.95), st.sampled_from([1.0, -1.0]))
def test_first_time_at_a_level(seed, share, sign):
    curve = drawn(seed)
    level = sign * curve.value[0] + share * (sign * curve.extreme(sign)[0] - sign * curve.value[0])
    expected = [0.0] if sign * curve.value[0] >= level else []
    for start, length, poly in pieces(curve):
        expected += list(start + inside((sign * poly - level).roots(), length))
    found = curve.first_at(level, sign)
    assert found == pytest.approx(min(expected), abs=1e-7)


@FEW
@given(SEEDS, st.floats(0.02, 1.5), st.booleans())
def test_last_time_above_a_level(seed, level, breaks):
    curve = drawn(seed, breaks=breaks)
    found = curve.last_above(level)
    if abs(curve.value[-1]) > level:
        assert np.isnan(found)
        return
    crossings = [0.0]
    for start, length, poly in pieces(curve):
        for side in (level, -level):
            crossings += list(start + inside((poly - side).roots(), length))
    # a magnitude that comes down by a jump does so at the break
    over = np.abs(curve.value) > level
    crossings += list(curve.time[1:][(curve.step == 0) & over[:-1] & ~over[1:]])
    assert found == pytest.approx(max(crossings), abs=1e-7)


def test_after_the_last_extreme_above_the_level_even_if_the_interval_begins_above_it():
    """Down through both bounds and back within one interval: the last crossing counts, not the first."""
    curve = Curve(np.array([0.0, 1.0]), np.array([1.0, 0.0]), np.array([-12.0, 3.0]), np.array([1.0]))
    poly = next(pieces(curve))[2]
    roots = inside((poly + 0.3).roots(), 1.0)
    assert len(roots) == 2
    assert curve.last_above(0.3) == pytest.approx(max(roots), rel=1e-12)


@FEW
@given(SEEDS)
def test_running_integral(seed):
    curve = drawn(seed)
    whole = CubicHermiteSpline(curve.time, curve.value, curve.rate).antiderivative()
    np.testing.assert_allclose(curve.integral(), whole(curve.time) - whole(0.0), atol=1e-11)


def test_never_reached_and_always_within():
    curve = Curve(np.array([0.0, 1.0, 2.0]), np.array([0.1, 0.2, 0.1]), np.zeros(3), np.ones(2))
    assert np.isnan(curve.first_at(0.3, 1.0))
    assert curve.last_above(0.5) == 0.0
    assert np.isnan(curve.last_above(0.05))


def test_an_infinite_value_counts_as_above_and_is_left_out_of_extremes():
    time = np.array([0.0, 1.0, 1.0, 2.0, 3.0])
    value = np.array([0.2, 0.1, np.nan, 4.0, 0.5])
    rate = np.array([0.0, 0.0, np.nan, -3.0, 0.0])
    curve = Curve(time, value, rate, np.array([1.0, 0.0, 1.0, 1.0]))
    assert curve.magnitude() == (4.0, 2.0)
    assert curve.extreme(-1.0) == (0.1, 1.0)
    assert curve.first_at(3.0, 1.0) == 2.0
    assert 2.0 < curve.last_above(1.0) < 3.0
    assert curve.last_above(4.5) == 2.0  # above up to the row that ends the infinite interval
    assert np.isfinite(curve.integral()).all()


def test_nothing_finite_has_no_extreme():
    nothing = np.full(3, np.nan)
    curve = Curve(np.arange(3.0), nothing, nothing, np.ones(2))
    assert np.isnan(curve.magnitude()).all()
    assert np.isnan(curve.last_above(1.0))


def test_the_earliest_of_equal_peaks():
    time = np.arange(5.0)
    curve = Curve(time, np.array([0.0, 1.0, 0.0, 1.0, 0.0]), np.zeros(5), np.ones(4))
    assert curve.extreme(1.0) == (1.0, 1.0)


def test_steps_that_vanish_in_the_time_of_the_rows():
    """Rows 1e-18 s apart at t = 10 s: lengths come from the offsets, values and crossings stay finite."""
    step = np.array([1e-18, 1e-18, 1.0])
    curve = Curve(np.array([10.0, 10.0, 10.0, 11.0]), np.array([0.0, 1.0, 2.0, 0.0]), np.zeros(4), step)
    assert curve.first_at(1.5, 1.0) == 10.0
    assert 10.0 < curve.last_above(0.5) < 11.0
    assert curve.integral()[1] == pytest.approx(0.5e-18, rel=1e-12)
