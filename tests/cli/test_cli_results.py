"""``transient table`` and ``transient figure``: reading a finished result."""

from __future__ import annotations

import csv
import io

import numpy as np
import pytest

from transient.result.store import read
from transient.sheet.figures import FIGURES

START = {".png": b"\x89PNG\r\n", ".svg": b"<?xml", ".pdf": b"%PDF"}


def test_table_prints_every_history(call, finished):
    said = call("table", finished)
    header, *rows = csv.reader(io.StringIO(said.out))
    result = read(finished)
    assert said.status == 0
    assert header[0] == "time [s]"
    assert "wall_stress upper [Pa]" in header
    column = np.array([float(row[header.index("wall_stress upper [Pa]")]) for row in rows])
    np.testing.assert_array_equal(column, result.variables["wall_stress"].data[:, 1])


def test_table_into_a_file_is_the_same_text(call, finished, tmp_path):
    said = call("table", finished, "--out", tmp_path / "histories.csv")
    assert (said.status, said.out, said.err) == (0, "", f"wrote {tmp_path / 'histories.csv'}\n")
    assert (tmp_path / "histories.csv").read_text(encoding="utf-8") == call("table", finished).out


def test_table_into_no_folder_is_refused(call, finished, tmp_path):
    said = call("table", finished, "--out", tmp_path / "no" / "histories.csv")
    assert said.status == 2
    assert said.err.count("\n") == 1
    assert "Traceback" not in said.err


@pytest.mark.parametrize("command", ["table", "figure"])
def test_what_is_no_result_is_refused_in_one_line(call, tmp_path, command):
    (tmp_path / "text.h5").write_text("no result", encoding="utf-8")
    for name in ("missing.h5", "text.h5", "."):
        said = call(command, tmp_path / name)
        assert said.status == 2
        assert said.out == ""
        assert said.err.startswith(str(tmp_path))
        assert said.err.count("\n") == 1


@pytest.mark.parametrize("name", [None, *FIGURES])
def test_a_figure_lies_beside_the_result(call, finished, name):
    said = call("figure", finished, *([name] if name else []))
    path = finished.with_name(f"flow_cell_{name or 'overview'}.png")
    assert (said.status, said.out, said.err) == (0, "", f"wrote {path}\n")
    assert path.read_bytes().startswith(START[".png"])
    path.unlink()


@pytest.mark.parametrize("ending", START)
def test_one_figure_in_a_chosen_format(call, finished, tmp_path, ending):
    name = next(iter(FIGURES))
    target = tmp_path / f"picture{ending}"
    assert call("figure", finished, name, "--out", target).status == 0
    assert target.read_bytes().startswith(START[ending])


def test_an_unknown_figure_names_those_there_are(call, finished):
    said = call("figure", finished, "strss")
    assert said.status == 2
    assert said.err.startswith('there is no figure "strss"; there are ')
    for name in FIGURES:
        assert name in said.err
