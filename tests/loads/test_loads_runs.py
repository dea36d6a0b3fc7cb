"""Loads of real runs: how they start, where they are infinite, what their periods hold."""

from __future__ import annotations

import json
from functools import cache

import numpy as np
import pytest

from transient.answer import run
from transient.case.read import read_case
from transient.cli import main
from transient.loads.harmonics import harmonics_of
from transient.loads.load import load_of
from transient.loads.spectrum import spectrum_of
from transient.loads.table import table_of
from transient.result.store import write

GAP = """
[gap]
shape = "plates"
height = "0.5 mm"
length = "80 mm"
width = "30 mm"
[fluid]
density = "890 kg/m^3"
viscosity = "45 mPa*s"
"""
CASES = {
    "steady": '[pressure]\ndrop_per_length = "900 Pa/m"\n[start]\nstate = "steady"\n[run]\nduration = "20 ms"\n',
    "sudden": '[wall.upper]\nspeed = "0.2 m/s"\n[run]\nduration = "30 ms"\n',
    "swinging": '[wall.lower]\nspeed = { kind = "sine", amplitude = "0.1 m/s", frequency = "40 Hz" }\n',
}
SECTION = 80e-3 * 30e-3


@pytest.fixture(scope="module")
def solved(tmp_path_factory):
    """The result of a case by name, each solved once."""

    @cache
    def once(name):
        path = tmp_path_factory.mktemp(name) / f"{name}.toml"
        path.write_text(GAP + CASES[name], encoding="utf-8")
        return run(read_case(path, []), judge="refinement")

    return once


def test_a_steady_load_asks_nothing_of_a_structure(solved):
    # Momentum of the gap: both walls together carry drop per length x volume.
    load = load_of(solved("steady"), "upper")
    assert load.peak == pytest.approx(900.0 * 0.5e-3 * SECTION / 2.0, rel=1e-6)
    assert load.before == pytest.approx(load.peak, rel=1e-12)
    factor = spectrum_of(load, np.geomspace(5.0, 2000.0, 30), 0.02).factor
    np.testing.assert_allclose(factor, 1.0, rtol=1e-6)


def test_a_sudden_start_hands_over_its_impulse_and_no_peak(solved, tmp_path, capsys):
    result = solved("sudden")
    load = load_of(result, "upper")
    # Stokes' first problem, wall stress mu U / sqrt(pi nu t) (Schlichting, from memory).
    law = 0.2 * np.sqrt(45e-3 * 890.0 / np.pi) * SECTION
    assert load.history.infinite[0].coefficient == pytest.approx(-law, rel=2e-3)
    found = table_of(load, 1e-3)
    assert found.impulse_error + found.outside == pytest.approx(0.0, abs=5e-3 * abs(load.history.impulse))
    write(result, tmp_path / "sudden.h5")
    capsys.readouterr()
    assert main(["loads", str(tmp_path / "sudden.h5"), "--wall", "upper", "--every", "1 ms"]) == 0
    said = capsys.readouterr().out
    assert "infinite at 0 s" in said
    assert "keeps the impulse" in said
    assert max(map(len, said.splitlines())) <= 80
    main(["loads", str(tmp_path / "sudden.h5"), "--wall", "upper", "--every", "1 ms", "--json"])
    told = json.loads(capsys.readouterr().out)
    assert (told["peak"], told["peak_time"], told["averaged_rows"]) == (None, 0.0, [0])


def test_harmonics_of_a_swinging_wall(solved):
    # Oscillating Couette flow, from memory: stress mu U k / tanh(k h) on the moving wall, k = sqrt(i omega / nu).
    found = harmonics_of(load_of(solved("swinging"), "lower"))
    k = np.sqrt(2j * np.pi * 40.0 * 890.0 / 45e-3)
    expected = -45e-3 * 0.1 * k / np.tanh(k * 0.5e-3) * SECTION
    assert found.frequency[0] == pytest.approx(40.0)
    assert found.amplitude[0] == pytest.approx(abs(expected), rel=2e-3)
    assert found.phase[0] == pytest.approx(np.angle(expected), abs=2e-3)
    assert found.amplitude[1:].max() < 1e-3 * found.amplitude[0]


def test_a_machine_at_the_loads_own_frequency_feels_it_most(solved):
    # Resonance of an oscillator under n full swings grows to about n pi (undamped, from memory: slope pi a swing).
    load = load_of(solved("swinging"), "lower")
    swings = load.history.time[-1] * 40.0
    factor = spectrum_of(load, np.array([4.0, 40.0])).factor
    assert factor[1] == pytest.approx(np.pi * swings, rel=0.15)
    assert factor[0] < 2.0
    # A stiff one follows the load; undamped it would keep the swing that the load's vertical start (like the root
    # of time, after a jump of acceleration) sets off.
    assert spectrum_of(load, np.array([4000.0]), 0.05).factor[0] == pytest.approx(1.0, abs=0.01)
