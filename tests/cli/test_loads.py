"""``transient loads``: what it prints, writes and refuses."""

from __future__ import annotations

import csv
import json
import os
import shutil
import subprocess
import sys

import h5py
import numpy as np
import pytest

from transient.result.result import Result, Variable
from transient.result.store import read, write

MS = ("--every", "1 ms")
ALL = ("--spectrum", "5 Hz", "2 kHz", "--damping-ratio", "0.02", "--cycles", "--repeat", "1000", "--factor", "1.5")


def rows_of(path):
    """(comments, header, rows) of a CSV with comment lines."""
    lines = path.read_text(encoding="utf-8").splitlines()
    comments = [line for line in lines if line.startswith("#")]
    header, *rows = csv.reader(line for line in lines if not line.startswith("#"))
    return comments, header, rows


def test_json_holds_the_peak_of_the_run(call, finished):
    said = call("loads", finished, "--wall", "upper", *MS, "--json", *ALL)
    assert (said.status, said.err) == (0, "")
    found = json.loads(said.out)
    wall = read(finished).summary["walls"]["upper"]
    assert found["peak"] == pytest.approx(wall["peak_force"], rel=1e-12)
    assert found["peak_time"] == wall["peak_time"]
    share = wall["peak_stress_error"] / abs(wall["peak_stress"])
    assert found["peak_error"] / abs(found["peak"]) == pytest.approx(share)
    assert (found["quantity"], found["unit"], found["step"]) == ("force", "N", 1e-3)
    assert found["factored"] == {"peak": 1.5 * found["peak"], "impulse": 1.5 * found["impulse"]}
    assert set(found["spectrum"]) >= {"frequency", "factor"}
    assert len(found["spectrum"]["frequency"]) == len(found["spectrum"]["factor"]) > 50
    assert found["repeat"] == 1000
    assert sum(count for *_, count in found["cycles"]) >= 1000


def test_the_table_holds_the_peak_and_its_impulse(call, finished, tmp_path):
    out = tmp_path / "load.csv"
    said = call("loads", finished, "--wall", "upper", *MS, "--csv", out, "--json", "--factor", "1.5")
    found = json.loads(said.out)
    comments, header, rows = rows_of(out)
    assert header == ["time [s]", "wall_force upper [N]", "wall_force upper x 1.5 [N]"]
    time, force, factored = np.array(rows, float).T
    np.testing.assert_allclose(np.diff(time), 1e-3, rtol=1e-9)
    np.testing.assert_array_equal(factored, 1.5 * force)
    row = int(np.argmax(np.abs(force)))
    assert (time[row], force[row], len(time)) == (found["peak_time"], found["peak"], found["rows"])
    assert np.trapezoid(force, time) - found["impulse"] == pytest.approx(found["impulse_error"], rel=1e-12)
    assert any("review under the local codes" in line for line in comments)
    assert f"wrote {out}\nwrote {tmp_path / 'load_extrema.csv'}\n" == said.err
    _, header, rows = rows_of(tmp_path / "load_extrema.csv")
    assert header == ["time [s]", "wall_force upper [N]", "wall_force upper x 1.5 [N]", "kind"]
    assert [repr(found["peak_time"]), repr(found["peak"]), "minimum"] in [[row[0], row[1], row[3]] for row in rows]


def test_each_measure_has_a_file_beside_the_table(call, finished, tmp_path):
    call("loads", finished, "--wall", "upper", *MS, *ALL, "--csv", tmp_path / "load.csv")
    assert sorted(path.name for path in tmp_path.iterdir()) == [
        "load.csv", "load_cycles.csv", "load_extrema.csv", "load_spectrum.csv",
    ]  # fmt: skip
    _, header, rows = rows_of(tmp_path / "load_spectrum.csv")
    assert header == ["frequency [Hz]", "dynamic load factor [1]"]
    assert (float(rows[0][0]), float(rows[-1][0])) == (5.0, 2000.0)
    assert rows_of(tmp_path / "load_cycles.csv")[1] == ["range [N]", "mean [N]", "count [1]"]


def test_two_plain_columns(call, finished, tmp_path):
    out = tmp_path / "load.txt"
    call("loads", finished, "--wall", "upper", *MS, "--plain", out, "--csv", tmp_path / "load.csv", "--factor", "3")
    plain = np.loadtxt(out)
    table = np.array(rows_of(tmp_path / "load.csv")[2], float)
    np.testing.assert_array_equal(plain, table[:, :2])
    assert "unfactored; multiply by 3.0" in out.read_text(encoding="utf-8")


def test_numbers_do_not_follow_the_systems_language(finished, tmp_path):
    written = []
    for language in ("C", "de_DE.UTF-8", "fr_FR.UTF-8"):
        out = tmp_path / f"{language}.csv"
        command = [sys.executable, "-m", "transient", "loads", str(finished), "--wall", "upper", *MS, "--csv", str(out)]
        subprocess.run(command, env={**os.environ, "LC_ALL": language}, check=True, capture_output=True)
        written.append(out.read_bytes())
    assert written[0] == written[1] == written[2]
    assert b"\r" not in written[0]


def test_printed_factored_and_unfactored(call, finished):
    said = call("loads", finished, "--wall", "upper", *MS, *ALL)
    assert said.status == 0
    assert "(unfactored)" in said.out
    assert "(factored)" in said.out
    assert "dynamic load factor at most" in said.out
    assert "rainflow count (ASTM E1049) of 1000 runs" in said.out
    assert max(map(len, said.out.splitlines())) <= 80
    assert "licensed" in said.out
    assert " ± " in said.out
    assert "the run's own verdict: good" in said.out
    plain = call("loads", finished, "--wall", "upper", *MS)
    assert "No safety factor is included." in plain.out
    assert "factored" not in plain.out.replace("unfactored", "")


@pytest.mark.parametrize("verdict", ["failed", "outside"])
def test_loads_of_a_run_that_distrusts_itself_say_so(call, finished, tmp_path, verdict):
    result = read(finished)
    write(Result(result.variables, {**result.summary, "verdict": verdict}, result.case_text), tmp_path / "bad.h5")
    said = call("loads", tmp_path / "bad.h5", "--wall", "upper", *MS, "--csv", tmp_path / "bad.csv")
    assert "do not rely on these numbers" in " ".join(said.out.split())
    assert f"# verdict of the run on itself: {verdict}" in rows_of(tmp_path / "bad.csv")[0]


def test_a_wall_need_not_be_named_where_there_is_one(call, finished, tmp_path):
    result = read(finished)
    keep = {name: v for name, v in result.variables.items() if "wall" not in v.dims and name != "wall"}
    stress = result.variables["wall_stress"]
    keep["wall"] = Variable(("wall",), np.array(["bore"]), "1", "wall")
    keep["wall_stress"] = Variable(stress.dims, stress.data[:, 1:], "Pa", "stress")
    write(Result(keep, {"title": ""}, result.case_text), tmp_path / "bore.h5")
    said = call("loads", tmp_path / "bore.h5", *MS, "--json")
    assert json.loads(said.out)["wall"] == "bore"
    assert json.loads(said.out)["unit"] == "Pa"


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (("--wall", "bore", *MS), 'there is no wall "bore"; the result has lower and upper'),
        (MS, "which wall? the result has lower and upper"),
        (("--wall", "upper", "--every", "5 Hz"), '--every: "5 Hz" is a frequency; a time is needed'),
        (("--wall", "upper", "--every", "1"), '--every: "1" has no unit'),
        (("--wall", "upper", "--every", "0 ms"), '--every: "0 ms" is not above zero'),
        (("--wall", "upper", "--every", "-1 ms"), '--every: "-1 ms" is not above zero'),
        (("--wall", "upper", "--every", "0.01 ns"), "rows of this run"),
        (("--wall", "upper", *MS, "--spectrum", "0 Hz", "9 Hz"), '--spectrum: "0 Hz" is not above zero'),
        (("--wall", "upper", *MS, "--spectrum", "5 Hz", "-9 Hz"), '--spectrum: "-9 Hz" is not above zero'),
        (("--wall", "upper", *MS, "--spectrum", "5 ms", "9 Hz"), "a frequency is needed"),
        (("--wall", "upper", *MS, "--damping-ratio", "0.1"), "--damping-ratio belongs to --spectrum"),
        (("--wall", "upper", *MS, "--spectrum", "5 Hz", "9 Hz", "--damping-ratio", "1"), "--damping-ratio 1: at least"),
        (("--wall", "upper", *MS, "--factor", "-2"), "--factor -2: a number above zero"),
        (("--wall", "upper", *MS, "--factor", "nan"), "--factor nan: a number above zero"),
        (("--wall", "upper", *MS, "--repeat", "0"), "--repeat 0: a number of runs"),
        (("--wall", "upper", *MS, "--harmonics"), "ends in no periodic state"),
        (("--wall", "upper", *MS, "--csv", "no/such/folder/load.csv"), "cannot be written"),
        (("--wall", "upper", *MS, "--csv", "."), "is a folder"),
        (("--wall", "upper", *MS, "--csv", "a.csv", "--plain", "a.csv"), "would be written over"),
        (("--wall", "upper", *MS, "--csv", "a.csv", "--plain", "a_extrema.csv"), "would be written over"),
        (("--wall", "upper"), "--every"),
    ],
)
def test_refusals_are_one_line(call, finished, tmp_path, monkeypatch, options, words):
    monkeypatch.chdir(tmp_path)
    said = call("loads", finished, *options)
    assert (said.status, said.out) == (2, "")
    assert words in said.err
    assert said.err.count("\n") == 1
    assert list(tmp_path.iterdir()) == []


def test_the_result_itself_is_never_written_over(call, finished):
    before = finished.read_bytes()
    for option in ("--csv", "--plain"):
        said = call("loads", finished, "--wall", "upper", *MS, option, finished)
        assert said.status == 2
        assert "would be written over" in said.err
    assert finished.read_bytes() == before


def test_what_is_no_result_is_refused_in_one_line(call, finished, tmp_path):
    (tmp_path / "text.h5").write_text("no result", encoding="utf-8")
    (tmp_path / "cut.h5").write_bytes(finished.read_bytes()[:5000])
    shutil.copy(finished, tmp_path / "newer.h5")
    with h5py.File(tmp_path / "newer.h5", "a") as file:
        file.attrs["schema"] = 99
    sweep = {
        "case": Variable(("case",), np.arange(2), "1", "case"),
        "peak_stress_upper": Variable(("case",), np.ones(2), "Pa", "peak"),
    }
    write(Result(sweep, {"title": ""}, ""), tmp_path / "sweep.h5")
    for name in ("missing.h5", "text.h5", "cut.h5", "newer.h5", "sweep.h5", "."):
        said = call("loads", tmp_path / name, "--wall", "upper", *MS)
        assert (said.status, said.out) == (2, "")
        assert said.err.startswith(str(tmp_path))
        assert said.err.count("\n") == 1
