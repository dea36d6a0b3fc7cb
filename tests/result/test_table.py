"""CSV of a result: read back with Python's own csv module, digit by digit."""

from __future__ import annotations

import csv
import io
import locale
import math
from pathlib import Path

import numpy as np
import pytest
from made import MADE, sweep

from transient.result.result import Result, ResultError, Variable
from transient.result.table import write_csv


def small() -> Result:
    return Result(
        {
            "wall": Variable(("wall",), np.array(["lower", "upper"]), "1", "wall"),
            "wall_stress": Variable(("time", "wall"), np.array([[0.1, math.nan], [1e-300, -1 / 3]]), "Pa", "stress"),
            "time": Variable(("time",), np.array([0.0, 0.1 + 0.2]), "s", "time"),
            "steps": Variable(("time",), np.array([1, 2]), "1", "steps"),
            "velocity": Variable(("profile_time", "position"), np.zeros((3, 4)), "m/s", "velocity"),
        },
        {},
        "",
    )


def test_text_is_exact():
    stream = io.StringIO()
    write_csv(small(), stream)
    assert stream.getvalue() == (
        "time [s],wall_stress lower [Pa],wall_stress upper [Pa],steps [1]\n"
        "0.0,0.1,nan,1\n"
        "0.30000000000000004,1e-300,-0.3333333333333333,2\n"
    )


def test_every_digit_comes_back(tmp_path: Path):
    result = MADE["plates_ramp"]()
    write_csv(result, tmp_path / "ramp.csv")
    raw = (tmp_path / "ramp.csv").read_bytes()
    assert b"\r" not in raw
    rows = list(csv.DictReader(io.StringIO(raw.decode())))
    np.testing.assert_array_equal([float(row["time [s]"]) for row in rows], result.time)
    np.testing.assert_array_equal([float(row["wall_stress upper [Pa]"]) for row in rows], result.wall_stress[:, 1])
    np.testing.assert_array_equal([float(row["flow_rate [m^3/s]"]) for row in rows], result.flow_rate)


def test_rows_of_a_sweep_with_texts_quoted():
    stream = io.StringIO()
    write_csv(sweep(), stream)
    rows = list(csv.reader(io.StringIO(stream.getvalue())))
    assert rows[0] == ["case [1]", "gap.height [m]", "status", "message", "settling_time [s]"]
    assert rows[2] == ["1", "0.0008", "refused", 'gap.height: "x", too small', "nan"]


def test_decimal_point_in_a_country_of_commas():
    former = locale.setlocale(locale.LC_NUMERIC)
    for name in ("de_DE.UTF-8", "de_DE.utf8", "fr_FR.UTF-8"):
        try:
            locale.setlocale(locale.LC_NUMERIC, name)
        except locale.Error:
            continue
        break
    else:
        pytest.skip("no locale with a decimal comma on this machine")
    try:
        stream = io.StringIO()
        write_csv(small(), stream)
    finally:
        locale.setlocale(locale.LC_NUMERIC, former)
    assert "0.30000000000000004,1e-300," in stream.getvalue()


def test_a_result_without_rows_is_refused():
    with pytest.raises(ResultError, match="neither histories nor rows"):
        write_csv(Result({}, {}, ""), io.StringIO())


def test_a_table_that_cannot_be_written_leaves_nothing(tmp_path: Path):
    with pytest.raises(ResultError, match="cannot be written"):
        write_csv(small(), tmp_path / "none" / "t.csv")
    bad = small()
    bad.variables["steps"] = Variable(("time",), np.array([1, 2, 3]), "1", "steps")
    with pytest.raises(ValueError, match="zip"):
        write_csv(bad, tmp_path / "t.csv")
    assert list(tmp_path.iterdir()) == []
