"""Harmonics of periodic loads against textbook Fourier series (from memory) and numpy's transform."""

from __future__ import annotations

import numpy as np
import pytest
from pulses import forced, measured

from transient.loads.harmonics import harmonics_of
from transient.loads.load import load_of
from transient.result.result import ResultError

PERIODIC = {"settling": {"period": 0.5, "regime": "periodic"}}


def harmonics(time, force, **more):
    return harmonics_of(load_of(forced(time, force, **PERIODIC), "upper"), **more)


def test_a_triangle_wave():
    # Sine-like triangle of amplitude 1: 8/pi^2 sum (-1)^k sin((2k+1) w t) / (2k+1)^2.
    time = np.arange(0.0, 1.51, 0.125)
    wave = np.resize([0.0, 1.0, 0.0, -1.0], len(time))
    found = harmonics(time, 5.0 + 3.0 * wave)
    number = np.arange(1, 21)
    odd = number % 2 == 1
    expected = np.where(odd, 3.0 * 8.0 / np.pi**2 / number**2, 0.0)
    assert found.mean == pytest.approx(5.0, rel=1e-12)
    np.testing.assert_allclose(found.frequency, 2.0 * number, rtol=1e-12)
    np.testing.assert_allclose(found.amplitude, expected, atol=1e-12)
    sign = np.exp(1j * found.phase[odd])
    np.testing.assert_allclose(sign, np.resize([1.0, -1.0], odd.sum()), atol=1e-9)


def test_a_square_wave_with_jumps_between_neighbouring_rows():
    # Square wave of amplitude 1: 4/pi sum sin((2k+1) w t) / (2k+1).
    edges = 0.25 * np.arange(1, 7)
    time = np.concatenate([[0.0], np.stack([np.nextafter(edges, 0.0), edges], axis=1).ravel()])
    level = np.concatenate([np.repeat(np.resize([1.0, -1.0], 6), 2), [1.0]])
    found = harmonics(time, level)
    number = np.arange(1, 21)
    np.testing.assert_allclose(found.amplitude, np.where(number % 2, 4.0 / np.pi / number, 0.0), atol=1e-12)
    np.testing.assert_allclose(found.phase[::2], 0.0, atol=1e-9)


def test_phases_count_from_the_start_of_the_run_wherever_it_ends():
    for until in (1.0, 1.13, 1.37):
        time = np.linspace(0.0, until, 40001)
        found = harmonics(time, 2.0 * np.sin(4.0 * np.pi * time + 0.7) - 0.5 * np.sin(12.0 * np.pi * time))
        np.testing.assert_allclose(found.amplitude[[0, 2]], [2.0, 0.5], rtol=1e-6)
        assert found.phase[0] == pytest.approx(0.7, abs=1e-6)
        assert abs(found.phase[2]) == pytest.approx(np.pi, abs=1e-5)


def test_the_numbers_of_a_discrete_transform():
    rng = np.random.default_rng(3)
    rows = rng.normal(size=32)
    fine = np.linspace(0.0, 0.5, 32 * 512 + 1)
    wave = np.interp(fine, np.linspace(0.0, 0.5, 33), np.append(rows, rows[0]))
    line = np.fft.rfft(wave[:-1]) / (len(fine) - 1) * 2.0
    found = harmonics(np.linspace(0.0, 0.5, 33), np.append(rows, rows[0]))
    np.testing.assert_allclose(found.amplitude, np.abs(line[1:21]), rtol=1e-4)
    # A planted error, half a step of delay, is seen.
    late = harmonics(np.linspace(0.0, 0.5, 33), np.append(rows[-1], rows))
    assert np.abs(np.exp(1j * late.phase) - 1j * line[1:21] / np.abs(line[1:21])).max() > 0.1
    np.testing.assert_allclose(np.exp(1j * found.phase), 1j * line[1:21] / np.abs(line[1:21]), atol=1e-4)


def test_where_there_are_none(capsys, tmp_path):
    steady = load_of(forced([0.0, 1.0], [0.0, 1.0], settling={"period": None}), "upper")
    short = load_of(forced([0.0, 0.3], [0.0, 1.0], **PERIODIC), "upper")
    infinite = load_of(forced([0.0, 0.8, 1.0], [0.0, np.nan, 1.0], **PERIODIC), "upper")
    for load, words in ((steady, "no periodic state"), (short, "shorter than one period"), (infinite, "infinite")):
        with pytest.raises(ResultError, match=words):
            harmonics_of(load)


def test_json_holds_them_in_si(capsys, tmp_path):
    time = np.linspace(0.0, 1.0, 4001)
    said = measured(capsys, tmp_path, forced(time, np.cos(4.0 * np.pi * time), **PERIODIC), "--harmonics")
    found = said["harmonics"]
    assert (found["period"], found["frequency"][0]) == (0.5, 2.0)
    assert found["amplitude"][0] == pytest.approx(1.0, rel=1e-5)
    assert found["phase"][0] == pytest.approx(np.pi / 2, rel=1e-5)
