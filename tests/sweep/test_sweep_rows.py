"""A sweep's rows are those of ``transient run``; the table and its file; the same for any number of workers."""

from __future__ import annotations

import csv
import io
import os
import pickle

import numpy as np
import pytest
import quick
import xarray

import transient as tr
from transient.case.read import read_case
from transient.sweep.columns import layout
from transient.sweep.places import LOST

MIXED = """
[vary]
"gap.height" = ["0.4 mm", "-1 mm", "0.8 mm"]
"run.duration" = ["auto", "10 ms"]
[keep]
histories = true
"""


def same(one, other):
    """Whether two tables hold the same data variables to the last bit."""
    assert list(one.variables) == list(other.variables)
    for name, variable in one.variables.items():
        again = other.variables[name]
        assert (variable.dims, variable.units, variable.long_name) == (again.dims, again.units, again.long_name)
        assert variable.data.tobytes() == again.data.astype(variable.data.dtype).tobytes(), name


@pytest.fixture(scope="module")
def mixed(tmp_path_factory):
    """A table with solved and refused rows, settled and unsettled ones, and histories; its case and its file."""
    folder = tmp_path_factory.mktemp("mixed")
    from two_plates import CASE

    from transient.cli import main

    (folder / "case.toml").write_text(CASE, encoding="utf-8")
    (folder / "many.toml").write_text('case = "case.toml"\n' + MIXED, encoding="utf-8")
    assert main(["sweep", str(folder / "many.toml"), "--out", str(folder / "many.h5"), "--quiet"]) == 0
    return tr.read_result(folder / "many.h5"), read_case(folder / "case.toml"), folder


def test_a_row_is_what_run_says(mixed):
    table, case, _ = mixed
    for row in (0, 1, 4, 5):
        duration = ["auto", "10 ms"][row % 2]
        alone = tr.run(case.replace({"gap.height": f"{float(table['gap.height'][row])!r} m", "run.duration": duration}))
        assert table.status[row] == "solved"
        assert table.verdict[row] == alone.summary["verdict"]
        for column in layout(case.problem()):
            expected = alone.summary
            for part in column.path:
                expected = expected.get(part)
            found = table[column.name][row]
            assert np.isnan(found) if expected is None else found == expected, column.name
        time, stress = table.history(row)
        np.testing.assert_array_equal(time, alone.time)
        np.testing.assert_array_equal(stress["upper"], alone.wall_stress[:, list(alone.wall).index("upper")])


def test_a_row_that_is_no_case_says_why_and_the_rest_go_on(mixed):
    table, _, _ = mixed
    assert table.status.tolist() == ["solved", "solved", "refused", "refused", "solved", "solved"]
    fault = '"-0.001 m" is not above zero; a length above zero is needed, such as "0.2 mm"'
    assert table.message[2] == f"gap.height: {fault}"
    assert np.isnan(table.peak_stress_upper[2:4]).all()
    assert table.verdict[2] == ""
    assert len(table.history(2)[0]) == 0
    assert table.summary["status"] == {"solved": 4, "refused": 2, "failed": 0}
    assert np.isnan(table.settling_time[1])  # not settled within 10 ms


def test_the_file_opens_in_xarray_as_it_is(mixed):
    table, _, folder = mixed
    with xarray.open_dataset(folder / "many.h5", engine="h5netcdf") as found:
        assert found.sizes["case"] == 6
        assert found["gap.height"].attrs["units"] == "m"
        assert found["gap.height"].values.tolist() == [4e-4, 4e-4, -1e-3, -1e-3, 8e-4, 8e-4]
        assert found["run.duration"].values.tolist() == ["auto", "10 ms"] * 3
        assert found["status"].values.tolist() == table.status.tolist()
        assert found.peak_stress_upper.attrs == {
            "units": "Pa", "long_name": "largest stress of the fluid on the upper wall (signed)",
        }  # fmt: skip
        assert found.history_rows.attrs["sample_dimension"] == "row"
        assert found.sizes["row"] == found.history_rows.values.sum()
        for name in found.variables:
            assert {"units", "long_name"} <= set(found[name].attrs), name
    assert table.to_xarray().sizes["case"] == 6


def test_table_writes_all_rows_as_csv(mixed, call):
    table, _, folder = mixed
    status, out, _ = call("table", folder / "many.h5")
    assert status == 0
    head, *lines = csv.reader(io.StringIO(out))
    assert head[:4] == ["case [1]", "gap.height [m]", "run.duration", "status"]
    assert len(lines) == 6
    assert [float(line[head.index("settling_time [s]")]) for line in lines] == pytest.approx(
        table.settling_time.tolist(), nan_ok=True, rel=0, abs=0
    )


def test_a_table_says_itself_in_a_few_lines_and_survives_pickling(mixed):
    table, _, _ = mixed
    lines = repr(table).splitlines()
    assert lines[0] == "Sweep 'Two plates': 6 cases: 4 solved, 2 refused"
    assert lines[1] == "  gap.height: -1 mm to 0.8 mm (3 values)"
    assert len(lines) < 20
    assert len(table) == 6
    same(pickle.loads(pickle.dumps(table)), table)
    with pytest.raises(KeyError, match=r"did you mean 'gap\.height'"):
        table["gap.hight"]


def test_any_number_of_workers_gives_the_same_to_the_last_bit(mixed):
    _, case, _ = mixed
    vary = {"wall.upper.speed.over": {"from": "10 ms", "to": "100 ms", "count": 34}}
    one, three = (tr.sweep(case, vary, workers=number, histories=True) for number in (1, 3))
    same(one, three)
    assert (one.status == "solved").all()


def test_memory_and_file_give_the_same(mixed, tmp_path):
    table, case, _ = mixed
    vary = {"gap.height": ["0.4 mm", "-1 mm", "0.8 mm"], "run.duration": ["auto", "10 ms"]}
    arguments = {"vary": vary, "histories": True}
    memory = tr.sweep(case, **arguments, workers=1)
    file = tr.sweep(case, **arguments, workers=1, out=tmp_path / "a.h5")
    same(memory, file)
    same(memory, table)
    assert memory.summary == file.summary
    assert not (tmp_path / "a.h5.parts").exists()


def test_columns_follow_from_what_the_rows_know():
    tree = {"gap": {"shape": "pipe", "diameter": "4 mm"}, "fluid": {"density": "900 kg/m^3", "viscosity": "10 mPa*s"},
            "wall": {}, "pressure": {"drop_per_length": "1 kPa/m"}, "run": {"accuracy": "1 %"}}  # fmt: skip
    table = tr.sweep(tr.Case(tree), vary={"gap.length": ["1 m", "2 m"]}, workers=1)
    assert "peak_force_bore" in table.variables  # the wetted area follows from the varied length
    assert table.peak_force_bore[1] == pytest.approx(2 * table.peak_force_bore[0])
    # Poiseuille: R/2 G on the wall, towards +x
    assert table.final_stress_bore == pytest.approx([1.0, 1.0], rel=1e-2)


def test_rows_of_a_listed_file_that_cannot_be_read_are_refused_rows(sweep_file, call, tmp_path):
    listed = "gap.height [mm],wall.upper.speed.over\n0.5,10 ms\nwide,10 ms\n0.6,10 kg\n"
    file = sweep_file("", 'case = "case.toml"\nrows = "rows.csv"\n', rows__csv=listed)
    status, out, _ = call("sweep", file, "--out", tmp_path / "out.h5", "--workers", "1")
    assert status == 0
    assert "3 cases: 1 solved, 2 refused" in out
    table = tr.read_result(tmp_path / "out.h5")
    assert table.message[1] == 'rows.csv:3: gap.height: "wide" is no number; a plain number in mm is needed'
    assert table.message[2].startswith('rows.csv:4: wall.upper.speed.over: "10 kg" is a mass; a time is needed')


def test_a_row_that_ends_its_process_is_a_failed_row(mixed, monkeypatch):
    _, case, _ = mixed
    quick.use(monkeypatch, quick.deadly)
    vary = {"gap.height": {"from": "0 m", "to": "39 m", "count": 40}}
    table = tr.sweep(case, vary, workers=2)
    assert table.status.tolist().count("failed") == 1
    assert (table.status[7], table.message[7]) == ("failed", LOST)
    np.testing.assert_array_equal(np.delete(table.settling_time, 7), np.delete(np.arange(40.0), 7))


def test_open_rows_go_to_the_next_runner(mixed, monkeypatch):
    from transient.sweep import runners
    from transient.sweep.columns import OPEN

    _, case, _ = mixed
    asked = []

    def half(base, keys, values, columns):
        out = quick.solve(base, keys, values, columns)
        out["status"][1::2] = OPEN
        asked.append(len(out["status"]))
        return out

    quick.use(monkeypatch, half)
    monkeypatch.setattr(runners, "RUNNERS", ("quick", "each"))
    heights = ["0.4 mm", "0.5 mm", "0.6 mm", "0.7 mm"]
    table = tr.sweep(case, {"gap.height": heights}, workers=1)
    assert asked == [4, 4]  # tried by the plan, then solved
    assert table.settling_time[0::2].tolist() == [4e-4, 6e-4]
    alone = tr.run(case.replace({"gap.height": "0.5 mm"}))
    assert table.settling_time[1] == alone.settling.time


def test_by_default_one_worker_per_core(monkeypatch):
    from transient.sweep import places

    assert places.default_workers() == len(os.sched_getaffinity(0))


def test_chunks_are_small_where_few_rows_can_be_solved_together(mixed, monkeypatch):
    from transient.sweep import runners
    from transient.sweep.columns import OPEN
    from transient.sweep.plan import plan_of

    _, case, _ = mixed
    tree = {"vary": {"gap.height": {"from": "1 m", "to": "2 m", "count": 400}}}
    quick.use(monkeypatch)
    monkeypatch.setattr(runners, "RUNNERS", ("quick", "each"))
    assert plan_of(case, tree).chunk == 256

    def seldom(base, keys, values, columns):
        out = quick.solve(base, keys, values, columns)
        out["status"][1:] = OPEN
        return out

    quick.use(monkeypatch, seldom)
    monkeypatch.setattr(runners, "RUNNERS", ("quick", "each"))
    assert plan_of(case, tree).chunk == 16
