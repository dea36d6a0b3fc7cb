"""The result file: netCDF-4 readers (h5netcdf through xarray, h5py) are the outside judges of its form."""

from __future__ import annotations

import copy
import errno
import json
import os
import pickle
import re
import sys
from pathlib import Path

import h5py
import numpy as np
import pytest
import xarray
from made import MADE, plates_ramp, sweep

from transient.result import store
from transient.result.result import Result, ResultError, Variable

KINDS = [*MADE.values(), sweep]


@pytest.fixture
def ramp() -> Result:
    return MADE["plates_ramp"]()


@pytest.fixture
def stored(ramp: Result, tmp_path: Path) -> Path:
    path = tmp_path / "ramp.h5"
    store.write(ramp, path)
    return path


@pytest.mark.parametrize("make", KINDS)
def test_round_trip_is_exact(make, tmp_path: Path):
    wanted = make()
    store.write(wanted, tmp_path / "r.h5")
    got = store.read(tmp_path / "r.h5")
    assert got.summary == wanted.summary
    assert got.case_text == wanted.case_text
    assert set(got.variables) == set(wanted.variables)
    for name, variable in wanted.variables.items():
        read = got.variables[name]
        assert (read.dims, read.units, read.long_name) == (variable.dims, variable.units, variable.long_name)
        assert read.data.dtype.kind == variable.data.dtype.kind
        np.testing.assert_array_equal(read.data, variable.data)


@pytest.mark.parametrize("make", KINDS)
def test_xarray_finds_coordinates_and_units_without_help(make, tmp_path: Path):
    wanted = make()
    store.write(wanted, tmp_path / "r.h5")
    with xarray.open_dataset(tmp_path / "r.h5", engine="h5netcdf") as dataset:
        for name, variable in wanted.variables.items():
            seen = dataset[name]
            assert seen.dims == variable.dims
            assert seen.attrs["units"] == variable.units
            assert seen.attrs["long_name"] == variable.long_name
            assert (name in dataset.coords) == (variable.dims == (name,))
            np.testing.assert_array_equal(seen.values, variable.data)
        assert json.loads(dataset.attrs["summary"]) == wanted.summary
        assert dataset.attrs["case"] == wanted.case_text


def test_xarray_selects_by_wall_name(stored: Path, ramp: Result):
    with xarray.open_dataset(stored, engine="h5netcdf") as dataset:
        upper = dataset["wall_stress"].sel(wall="upper").interp(time=0.05)
        assert float(upper) == pytest.approx(np.nanmin(ramp.wall_stress[:, 1]), rel=1e-12)


def test_to_xarray_equals_what_xarray_reads(stored: Path, ramp: Result):
    with xarray.open_dataset(stored, engine="h5netcdf") as dataset:
        memory = store.read(stored).to_xarray()
        xarray.testing.assert_equal(memory, dataset.load())
        assert memory["wall_stress"].attrs == dataset["wall_stress"].attrs


def test_to_xarray_without_xarray_says_what_to_install(ramp: Result, monkeypatch):
    monkeypatch.setitem(sys.modules, "xarray", None)
    with pytest.raises(ResultError, match=r'pip install "transient\[xarray\]"'):
        ramp.to_xarray()


def test_dimension_scales_and_root_attributes(stored: Path):
    with h5py.File(stored) as file:
        assert [dim[0].name for dim in file["wall_stress"].dims] == ["/time", "/wall"]
        assert all(file[name].is_scale for name in ("time", "profile_time", "position", "wall"))
        assert set(file.attrs) == {"title", "program", "created", "Conventions", "schema", "summary", "case"}
        assert re.fullmatch(r"transient \d+\.\d+\.\d+.*", file.attrs["program"])
        assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", file.attrs["created"])
        assert file.attrs["title"] == "Flow cell brought up to speed"


def test_same_result_gives_the_same_bytes(ramp: Result, tmp_path: Path):
    fixed = Result(ramp.variables, ramp.summary, ramp.case_text, {"created": "2030-01-01T00:00:00Z"})
    store.write(fixed, tmp_path / "a.h5")
    store.write(fixed, tmp_path / "b.h5")
    assert (tmp_path / "a.h5").read_bytes() == (tmp_path / "b.h5").read_bytes()


def test_large_arrays_are_compressed_small_ones_are_not(ramp: Result, tmp_path: Path):
    time = np.linspace(0, 1, 200_000)
    large = Result({"time": Variable(("time",), time, "s", "time"), "wall": ramp.variables["wall"]}, {}, "")
    store.write(large, tmp_path / "large.h5")
    assert (tmp_path / "large.h5").stat().st_size < 0.7 * time.nbytes
    with h5py.File(tmp_path / "large.h5") as file:
        assert file["wall"].chunks is None
    np.testing.assert_array_equal(store.read(tmp_path / "large.h5").time, time)


def test_empty_dimension_bare_dimension_truth_values_and_long_texts(tmp_path: Path):
    variables = {
        "drive_break": Variable(("drive_break",), np.zeros(0), "s", "breaks"),
        "settled": Variable(("sample",), np.array([True, False, True]), "1", "settled"),
        "note": Variable(("sample",), np.array(["Größe", "", "µ" * 5000]), "1", "note"),
    }
    case = "# " + "x" * 300_000 + "\n"
    store.write(Result(variables, {"title": "π"}, case), tmp_path / "r.h5")
    got = store.read(tmp_path / "r.h5")
    assert set(got.variables) == set(variables)
    assert got.settled.dtype == bool
    assert got.note.tolist() == variables["note"].data.tolist()
    assert got.variables["note"].dims == ("sample",)
    assert got.case_text == case
    with xarray.open_dataset(tmp_path / "r.h5", engine="h5netcdf") as dataset:
        assert dataset["settled"].dtype == bool
        assert dataset.sizes == {"sample": 3, "drive_break": 0}


def test_numpy_numbers_in_a_summary_are_json_and_nothing_else_is_lost(tmp_path: Path):
    summary = {"a": np.float64(0.1), "b": np.bool_(True), "c": np.int64(3), "d": None, "e": np.arange(2)}
    store.write(Result({}, summary, ""), tmp_path / "r.h5")
    assert store.read(tmp_path / "r.h5").summary == {"a": 0.1, "b": True, "c": 3, "d": None, "e": [0, 1]}


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), np.float64("nan")])
def test_a_summary_that_json_cannot_carry_is_refused(bad: float, ramp: Result, tmp_path: Path):
    with pytest.raises(ResultError, match="not finite"):
        store.write(Result(ramp.variables, {"x": {"y": bad}}, ""), tmp_path / "r.h5")
    assert os.listdir(tmp_path) == []


def test_sizes_that_disagree_are_refused(ramp: Result, tmp_path: Path):
    short = {**ramp.variables, "mean_velocity": Variable(("time",), ramp.time[:-1], "m/s", "mean velocity")}
    with pytest.raises(ResultError, match="mean_velocity has 1099 values along time, others have 1100"):
        store.write(Result(short, {}, ""), tmp_path / "r.h5")
    flat = {**ramp.variables, "mean_velocity": Variable(("time", "wall"), ramp.time, "m/s", "mean velocity")}
    with pytest.raises(ResultError, match="mean_velocity has 1 dimensions but names 2"):
        store.write(Result(flat, {}, ""), tmp_path / "r.h5")


class Planted(Exception):
    """Stands for a crash in the middle of writing."""


@pytest.mark.parametrize("place", ["_write_scales", "_write_variable"])
def test_a_failure_while_writing_leaves_the_former_file_and_nothing_else(place, stored, ramp, monkeypatch):
    before = stored.read_bytes()

    def fail(*_):
        raise Planted

    monkeypatch.setattr(store, place, fail)
    with pytest.raises(Planted):
        store.write(ramp, stored)
    assert os.listdir(stored.parent) == [stored.name]
    assert stored.read_bytes() == before


def test_a_failure_at_the_rename_leaves_nothing(ramp, tmp_path, monkeypatch):
    def fail(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", fail)
    with pytest.raises(ResultError, match="cannot be written: no space left on device"):
        store.write(ramp, tmp_path / "r.h5")
    assert os.listdir(tmp_path) == []


def test_a_folder_that_does_not_exist_is_one_line(ramp: Result, tmp_path: Path):
    with pytest.raises(ResultError) as caught:
        store.write(ramp, tmp_path / "none" / "r.h5")
    assert str(caught.value) == f"{tmp_path / 'none' / 'r.h5'} cannot be written: no such file or directory"


def _edited(path: Path, **attributes) -> None:
    with h5py.File(path, "r+") as file:
        for name, value in attributes.items():
            if value is None:
                del file.attrs[name]
            else:
                file.attrs[name] = value


def _newer(path: Path) -> None:
    _edited(path, schema=store.SCHEMA + 1)


def _no_schema(path: Path) -> None:
    _edited(path, schema=None)


def _no_case(path: Path) -> None:
    _edited(path, case=None)


def _spoilt_summary(path: Path) -> None:
    _edited(path, summary='{"title": ')


def _no_units(path: Path) -> None:
    with h5py.File(path, "r+") as file:
        del file["wall_stress"].attrs["units"]


def _scale_gone(path: Path) -> None:
    with h5py.File(path, "r+") as file:
        file["mean_velocity"].dims[0].detach_scale(file["time"])


def _cut(path: Path) -> None:
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])


def _header_only(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:12])


def _text(path: Path) -> None:
    path.write_text("time,stress\n0,1\n")


def _empty(path: Path) -> None:
    path.write_bytes(b"")


def _foreign(path: Path) -> None:
    path.unlink()
    with h5py.File(path, "w") as file:
        file["x"] = [1.0, 2.0]


def _missing(path: Path) -> None:
    path.unlink()


def _folder(path: Path) -> None:
    path.unlink()
    path.mkdir()


SPOILT = [
    (_newer, "has schema 2, newer than 1 which this version reads; update it"),
    (_no_schema, "is an HDF5 file, but not a result of this program"),
    (_foreign, "is an HDF5 file, but not a result of this program"),
    (_no_case, "is damaged, its attribute case is missing"),
    (_spoilt_summary, "is damaged, its summary is not readable"),
    (_no_units, "is damaged, wall_stress has no units"),
    (_scale_gone, "is cut short or damaged; run the case again"),
    (_cut, "is cut short or damaged; run the case again"),
    (_header_only, "is cut short or damaged; run the case again"),
    (_text, "is not an HDF5 file; a result file (.h5) is needed"),
    (_empty, "is not an HDF5 file; a result file (.h5) is needed"),
    (_missing, "there is no such file"),
    (_folder, "is a folder; a result file (.h5) is needed"),
]


@pytest.mark.parametrize(("spoil", "words"), SPOILT, ids=[spoil.__name__ for spoil, _ in SPOILT])
def test_a_bad_file_is_one_line(spoil, words: str, stored: Path):
    spoil(stored)
    with pytest.raises(ResultError) as caught:
        store.read(stored)
    assert str(caught.value) == f"{stored}: {words}"


def test_a_file_that_may_not_be_read_is_one_line(stored: Path, monkeypatch: pytest.MonkeyPatch):
    # permissions do not bind everyone who may run this: what the file library raises where they do
    def denied(*_, **__):
        raise PermissionError(errno.EACCES, "unable to open file", str(stored))

    monkeypatch.setattr(store.h5py, "File", denied)
    with pytest.raises(ResultError, match="cannot be read: permission denied"):
        store.read(stored)


def test_numbers_are_attributes(ramp: Result):
    assert ramp.settling.time == ramp.summary["settling"]["time"]
    assert ramp.walls["upper"].peak_stress == ramp.walls.upper["peak_stress"] < 0
    assert ramp.flow.final_mean_velocity == pytest.approx(0.15, rel=1e-3)
    assert ramp.velocity.shape == (120, 101)
    assert ramp.verdict == "good"
    assert list(ramp.walls) == ["lower", "upper"]
    assert dict(ramp.walls["upper"]) == ramp.summary["walls"]["upper"]
    assert {"velocity", "settling"} <= set(dir(ramp))
    assert "time" in dir(ramp.settling)


@pytest.mark.parametrize(
    ("ask", "words"),
    [
        (lambda r: r.wal_stress, "a result has no 'wal_stress'; did you mean 'wall_stress'?"),
        (lambda r: r.settling.tim, "settling has no 'tim'; did you mean 'time'?"),
        (lambda r: r.walls.upper.peak, "walls.upper has no 'peak'; did you mean 'peak_time'?"),
        (lambda r: r.walls.bore, "walls has no 'bore'; there are: lower, upper"),
    ],
)
def test_an_unknown_name_gets_the_nearest(ask, words: str, ramp: Result):
    with pytest.raises(AttributeError) as caught:
        ask(ramp)
    assert str(caught.value) == words


def test_copies_and_pickles(ramp: Result):
    for other in (copy.copy(ramp), copy.deepcopy(ramp), pickle.loads(pickle.dumps(ramp))):
        assert other.settling.time == ramp.settling.time
    assert pickle.loads(pickle.dumps(ramp.settling)).time == ramp.settling.time


def test_lists_of_the_summary_are_views_too():
    result = Result({}, {"checks": [{"name": "momentum", "value": 1e-6}]}, "")
    assert result.checks[0].name == "momentum"


def test_display_is_short_and_escaped():
    result = plates_ramp()
    text = repr(result)
    assert text.splitlines()[0] == "Result 'Flow cell brought up to speed' (plates, good)"
    assert "upper: peak stress -1.511 Pa ± 1.5 mPa at 50 ms, final -0.3758 Pa at 0.3 m/s" in text
    assert len(text.splitlines()) <= 8
    sly = Result(result.variables, {**result.summary, "title": "<script>alert(1)</script>"}, "")
    page = sly._repr_html_()
    assert "<script>" not in page
    assert "&lt;script&gt;" in page


def test_display_of_an_unbounded_and_of_an_unsettled_run():
    text = repr(MADE["sudden_start"]())
    assert "upper: stress unbounded at 0 s" in text
    never = Result({}, {"title": "t", "settling": {"reached": False, "time": None, "within": 0.01}}, "")
    assert "settling: not within 1 % in this run" in repr(never)
