"""A sweep that is no sweep is refused in one line with file, line and key, before anything is solved or written."""

from __future__ import annotations

import shutil
from collections import namedtuple

import pytest

from transient.case.model import CaseError
from transient.sweep import plan as plans
from transient.sweep.plan import read_plan

HEIGHT = '"gap.height" = { from = "0.4 mm", to = "1.2 mm", count = 3 }\n'

# (text of the sweep file below its first line, the whole message after the file's name)
BAD = {
    '[vary]\n"gap.heigth" = ["1 mm"]\n': ':3: gap.heigth: unknown key; did you mean "height"?',
    '[vary]\n"gap.height" = { from = "0.4 kg", to = "1 kg", count = 3 }\n':
        ':3: gap.height: "0.4 kg" is a mass; a length is needed, such as "0.4 mm"',
    '[vary]\n"gap.height" = { from = "0.4 mm", to = "1 s", count = 3 }\n':
        ':3: gap.height.to: "1 s" is a time; a length is needed, such as "1 mm"',
    '[vary]\n"gap.height" = { from = "0.4 mm", to = 1.2, count = 3 }\n':
        ':3: gap.height.to: 1.2 has no unit; a length is needed, such as "1.2 mm"',
    '[vary]\n"gap.height" = [\n  "1 mm",\n  "2 N",\n]\n':
        ':5: gap.height.values: "2 N" is a force; a length is needed, such as "2 mm"',
    '[vary]\n"gap.height" = { values = [] }\n':
        ':3: gap.height.values: an empty list is no grid; a list is needed, such as ["0.4 mm", "0.8 mm"]',
    '[vary]\n"gap.height" = { from = "1 mm", to = "2 mm", count = 0 }\n':
        ":3: gap.height.count: 0 makes no grid; a whole number from 1 is needed, such as 5",
    '[vary]\n"gap.height" = { from = "0 mm", to = "2 mm", count = 3, spacing = "log" }\n':
        ":3: gap.height.spacing: a log spacing needs ends above zero; lin is needed here",
    '[vary]\n"gap.height" = { form = "1 mm", to = "2 mm", count = 3 }\n':
        ':3: gap.height.form: unknown key; did you mean "from"?',
    '[vary]\n"gap.height" = "1 mm"\n':
        ':3: gap.height: "1 mm" is no range; one is needed, such as '
        '{ from = "0.4 mm", to = "1.2 mm", count = 5 } or { values = ["0.4 mm", "0.8 mm"] }',
    '[vary]\n"start.state" = { from = "rest", to = "steady", count = 2 }\n':
        ':3: start.state: takes no range; a list is needed, such as { values = ["rest", "steady"] }',
    '[vary]\n"gap.count" = { from = 1, to = 4, count = 3 }\n':
        ":3: gap.count.count: 2.5 would be one of its values and is no whole number; "
        "a count that falls on whole numbers is needed",
    '[vary]\n': ': varies nothing; [vary] is needed, such as "gap.height" = { values = ["0.4 mm", "0.8 mm"] }',
    f'[vary]\n{HEIGHT}[scatter]\nsamples = 4\n"gap.height" = {{ uniform = ["1 mm", "2 mm"] }}\n':
        ":6: gap.height: stands in [vary] and in [scatter]; it is needed in one of them",
    f'[vary]\n{HEIGHT}[scatter]\nsamples = 4\n':
        ":4: scatter: names no key that scatters; one is needed, such as "
        '"gap.width" = { normal = ["25 mm", "0.05 mm"] }',
    f'[vary]\n{HEIGHT}[scatter]\n"gap.width" = {{ uniform = ["1 mm", "2 mm"] }}\n':
        ":4: scatter: samples is missing; a whole number from 1 is needed, such as samples = 500",
    '[scatter]\nsamples = 4\n"gap.width" = { uniform = ["2 mm", "1 mm"] }\n':
        ":4: gap.width.uniform: its values do not rise; [least, greatest] is needed",
    '[scatter]\nsamples = 4\n"gap.width" = { normal = ["2 mm", "0 mm"] }\n':
        ':4: gap.width.normal: "0 mm" is no standard deviation; one above zero is needed',
    '[scatter]\nsamples = 4\n"gap.width" = { normal = ["2 mm"] }\n':
        ':4: gap.width.normal: a list does not fit; [mean, standard deviation] is needed, such as '
        '{ normal = ["25 mm", "0.05 mm"] }',
    '[scatter]\nsamples = 4\n"start.state" = { uniform = ["rest", "steady"] }\n':
        ":4: start.state: is no quantity that could scatter; list its values in [vary]",
    f'[vary]\n{HEIGHT}[kept]\nhistories = true\n': ':4: kept: unknown key; did you mean "keep"?',
    f'[vary]\n{HEIGHT}[keep]\nhistories = 1\n':
        ":5: keep.histories: 1 is neither true nor false; true or false is needed",
    '[vary]\nwall.upper.speed.over = { from = "1 m", to = "2 m", count = 2 }\n':
        ':3: wall.upper.speed.over: "1 m" is a length; a time is needed, such as "1 ms"',
}  # fmt: skip


@pytest.mark.parametrize("text", list(BAD))
def test_one_line_with_file_line_key_given_needed_and_example(sweep_file, call, tmp_path, text):
    file = sweep_file(text)
    status, out, err = call("sweep", file, "--out", tmp_path / "out.h5")
    assert (status, out) == (2, "")
    assert err == f"{file}{BAD[text]}\n"
    assert {path.name for path in tmp_path.iterdir()} == {"case.toml", "many.toml"}


@pytest.mark.parametrize(
    ("csv", "message"),
    [
        (None, "rows.csv: cannot be read (No such file or directory)"),
        ("gap.height [mm]\n", "rows.csv: holds no rows; a header such as"),
        ("gap.height [mm],\n1,2\n", 'rows.csv:1: "" names no key; a header such as'),
        ("gap.height [mm],gap.height [m]\n1,2\n", "rows.csv:1: gap.height: is given twice; keep one of them"),
        ("gap.height [mm],gap.width [mm]\n1,2\n1\n", "rows.csv:3: has 1 cells; 2 are needed"),
    ],
)
def test_listed_rows_that_cannot_be_read(sweep_file, csv, message):
    files = {} if csv is None else {"rows__csv": csv}
    file = sweep_file("", 'case = "case.toml"\nrows = "rows.csv"\n', **files)
    with pytest.raises(CaseError) as refusal:
        read_plan(str(file))
    assert str(refusal.value).startswith(f"{file}:2: rows: {message}")


def test_a_column_in_the_wrong_unit_is_no_list_of_refused_rows(sweep_file):
    file = sweep_file("", 'case = "case.toml"\nrows = "rows.csv"\n', rows__csv="gap.height [kg]\n1\n2\n")
    with pytest.raises(CaseError, match=r'many.toml:2: gap.height: "1 kg" is a mass; a length is needed'):
        read_plan(str(file))


@pytest.mark.parametrize(
    ("head", "message"),
    [
        ("", ': case: is missing; the case file to vary is needed, such as case = "flow_cell.toml"'),
        ("case = 3\n", ":1: case: 3 does not belong here; the path of a case file is needed"),
        ("case = \n", ": is not TOML: invalid value (at line 1, column 8)"),
        ('[gap]\nshape = "plates"\n', ": case: is missing; this is a case file; a sweep file names one"),
    ],
)
def test_no_sweep_file(sweep_file, head, message):
    file = sweep_file("", head)
    with pytest.raises(CaseError) as refusal:
        read_plan(str(file))
    assert str(refusal.value).startswith(f"{file}{message}")


def test_a_missing_case_and_a_bad_case_speak_for_themselves(sweep_file):
    file = sweep_file(f"[vary]\n{HEIGHT}", 'case = "none.toml"\n')
    with pytest.raises(CaseError, match=r"none.toml: there is no such file"):
        read_plan(str(file))
    file = sweep_file(f"[vary]\n{HEIGHT}", case='[gap]\nshape = "plates"\n')
    with pytest.raises(CaseError, match=r"case.toml:1: gap.height: is missing"):
        read_plan(str(file))


def test_table_files_do_not_vary_since_other_machines_need_not_have_them(sweep_file):
    table = '{ kind = "table", file = "a.csv", time_unit = "s", unit = "m/s" }'
    file = sweep_file(f'[vary]\n"wall.upper.speed" = [{table}, "1 m/s"]\n', a__csv="0,0\n1,1\n")
    with pytest.raises(CaseError, match=r"many.toml:3: wall.upper.speed: a table file cannot vary"):
        read_plan(str(file))


def test_more_than_ten_million_cases_are_asked_back(sweep_file, call, tmp_path):
    axis = '{ from = "1 mm", to = "2 mm", count = 3163 }'
    file = sweep_file(f'[vary]\n"gap.height" = {axis}\n"gap.length" = {axis}\n')
    status, out, err = call("sweep", file, "--out", tmp_path / "out.h5")
    assert (status, out) == (2, "")
    assert err == f"{file}: makes 10,004,569 cases, more than 10,000,000; if that is meant, add --confirm\n"
    assert not (tmp_path / "out.h5.parts").exists()


def test_what_does_not_fit_the_disk_or_the_memory_is_refused_before_it_starts(sweep_file, call, tmp_path, monkeypatch):
    file = sweep_file(f"[vary]\n{HEIGHT}")
    usage = namedtuple("usage", "total used free")
    monkeypatch.setattr(shutil, "disk_usage", lambda path: usage(10**6, 10**6 - 500, 500))
    status, _, err = call("sweep", file, "--out", tmp_path / "out.h5")
    assert status == 2
    assert "3 cases need about" in err
    assert "GB on that disk, which has 5e-07 GB free; fewer cases or another --out is needed" in err
    assert not (tmp_path / "out.h5.parts").exists()
    monkeypatch.setattr(plans, "_free_memory", lambda: 100)
    status, _, err = call("sweep", file, "--out", tmp_path / "out.h5")
    assert status == 2
    assert "GB of memory" in err


def test_a_count_beyond_all_memory_does_not_even_make_its_axis(sweep_file):
    file = sweep_file('[vary]\n"gap.height" = { from = "1 mm", to = "2 mm", count = 1000000000 }\n')
    with pytest.raises(CaseError, match="1,000,000,000 cases need about"):
        read_plan(str(file))


@pytest.mark.parametrize(
    ("options", "message"),
    [
        (["--workers", "0"], "--workers 0: a whole number from 1 to 1024 is needed, such as --workers 2"),
        (["--out", "a.csv"], "--out a.csv: a result file ends in .h5, such as a.csv.h5"),
        (["--resume", "--overwrite"], "--resume and --overwrite: one of them is needed, not both"),
        (["--out", "/proc/none/a.h5"], "/proc/none/a.h5: cannot be written (No such file or directory)"),
        (["--out", "case.toml/a.h5"], "case.toml/a.h5: results go into a folder, and case.toml is a file"),
    ],
)
def test_options(sweep_file, call, tmp_path, monkeypatch, options, message):
    file = sweep_file(f"[vary]\n{HEIGHT}")
    monkeypatch.chdir(tmp_path)
    status, out, err = call("sweep", file, *options)
    assert (status, out) == (2, "")
    assert err.startswith(message)
    assert err.count("\n") == 1
