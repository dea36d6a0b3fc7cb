"""Histories from CSV files and lists: what is read, what is refused, and with which row."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from transient.case.model import Case
from transient.case.read import CaseError, read_case

F = "carriage.toml"
SPEED = 'speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }'
TABLE = 'speed = {{ kind = "table", file = "{file}", time_unit = "ms", unit = "mm/s"{more} }}'


def table(more: str = "", file: str = "speed.csv") -> dict[str, str]:
    """The carriage with its speed from a file."""
    return {SPEED: TABLE.format(file=file, more=more)}


@pytest.mark.parametrize(
    ("text", "more"),
    [
        ("time,speed\n0,0\n10,5\n20,7.5\n", ""),
        ("0,0\n10,5\n20,7.5\n", ""),
        ("\ufefftime;speed\r\n0;0\r\n10;5\r\n20;7.5\r\n\r\n", ""),
        ("# logged by the rig\ntime\tspeed\n0\t0\n10\t5\n20\t7.5", ""),
        ("n, t [ms], load, v [mm/s]\n1, 0, 9, 0\n2, 10, 9, 5\n3, 20, 9, 7.5\n",
         ', time_column = "t [ms]", column = "v [mm/s]"'),
        ("n,t,load,v\n1,0,9,0\n2,10,9,5\n3,20,9,7.5\n", ", time_column = 2, column = 4"),
        ("n,t,load,v\n1,0,9,0\n2,10,9,5\n3,20,9,7.5\n", ', time_column = "2", column = "v"'),
    ],
)  # fmt: skip
def test_columns_are_found(read: Callable[..., Case], write: Callable[..., str], text: str, more: str) -> None:
    write(text, "speed.csv")
    speed = read(table(more)).problem().speeds[1]
    assert speed.pieces(1.0).value(np.array([0.0, 0.005, 0.01, 0.02, 0.5])).tolist() == pytest.approx(
        [0.0, 0.0025, 0.005, 0.0075, 0.0075], rel=1e-15
    )


def test_the_file_becomes_lists_in_the_text(
    read: Callable[..., Case], write: Callable[..., str], tmp_path: Path
) -> None:
    write("time,speed\n0.1,0.3\n10,5\n", "speed.csv")
    case = read(table())
    (tmp_path / "speed.csv").unlink()
    again = read_case(write(case.text(), "again.toml"))
    assert again == case
    assert again.text() == case.text()
    assert "times = [0.1, 10.0], values = [0.3, 5.0]" in case.text()
    assert "speed.csv" not in case.text()
    was, now = (one.problem().speeds[1].pieces(1.0) for one in (case, again))
    assert was.poly.tobytes() == now.poly.tobytes()
    assert was.starts.tobytes() == now.starts.tobytes()


def test_the_folder_is_the_case_files(write: Callable[..., str], tmp_path: Path, read: Callable[..., Case]) -> None:
    (tmp_path / "rig" / "data").mkdir(parents=True)
    (tmp_path / "rig" / "data" / "speed.csv").write_text("0,0\n10,5\n")
    read()  # writes the carriage
    text = (tmp_path / F).read_text().replace(SPEED, TABLE.format(file="data/speed.csv", more=""))
    (tmp_path / "rig" / "case.toml").write_text(text)
    assert read_case("rig/case.toml").problem().speeds[1].pieces(1.0).value(np.array([0.01])) == pytest.approx(0.005)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("0,0\n10,5\n5,7\n", "file: speed.csv row 3: the time goes back to 5; rising times are needed"),
        ("t,v\n0,0\n10,\n20,7\n", "file: speed.csv row 3 has no value in column 2; a table without gaps is needed"),
        ("t,v\n0,0\n10\n20,7\n", "file: speed.csv row 3 has no value in column 2; a table without gaps is needed"),
        ("t,v\n0,0\n\n20,7\n", "file: speed.csv row 3 is empty; a table without gaps is needed"),
        ("t;v\n0;0\n10;5,5\n", 'file: speed.csv row 3: "5,5" has a decimal comma; a decimal point is needed'),
        ('t,v\n0,0\n10,"5,5"\n', 'file: speed.csv row 3: "5,5" has a decimal comma; a decimal point is needed'),
        ("t,v\n0,0\n10,5,5\n",
         "file: speed.csv row 3 has 3 cells, the first row 2; are there decimal commas? Points are needed"),
        ("t,v\n0,0\n10,fast\n", 'file: speed.csv row 3: "fast" is no number'),
        ("t,v\n0,0\n10,nan\n", 'file: speed.csv row 3: "nan" is no number'),
        ("t,v\n0,0\n10,1e999\n", 'file: speed.csv row 3: "1e999" is no number'),
        ("0,0\n10,1 mm/s\n", 'file: speed.csv row 2: "1 mm/s" is no number'),
        ("", "file: speed.csv is empty; times and values are needed"),
        ("t,v\n", "file: speed.csv holds no rows of numbers; times and values are needed"),
        ("t\n0\n1\n", "column: speed.csv has 1 columns; a column from 1 to 1 is needed, not 2"),
        ("-1,0\n10,5\n", "times: row 1 has the time -0.001 s; times count from the start of the run, t = 0"),
        ("0,0\n1,2\n1,3\n1,4\n", "times: rows 2 to 4 share one time; a jump is two rows at one time"),
        (b"\x00\x01", 'file: "speed.csv" is not a text file (UTF-8)'),
        (b"\xff\xfe0,1", 'file: "speed.csv" is not a text file (UTF-8)'),
    ],
)  # fmt: skip
def test_refused_tables(
    refusal: Callable[..., str], write: Callable[..., str], text: str | bytes, message: str
) -> None:
    write(text, "speed.csv")
    assert refusal(table()) == f"{F}:16: wall.upper.speed.{message}"


RELATIVE = 'the path of a CSV file relative to the case file is needed, such as "speed.csv"'


@pytest.mark.parametrize(
    ("file", "message"),
    [
        ("none.csv", 'there is no file "none.csv" beside the case file'),
        ("/etc/passwd", f'"/etc/passwd" is not relative to the case file; {RELATIVE}'),
        ("C:/data/speed.csv", f'"C:/data/speed.csv" is not relative to the case file; {RELATIVE}'),
        ("~/speed.csv", f'"~/speed.csv" is not relative to the case file; {RELATIVE}'),
        ("../speed.csv", f'"../speed.csv" leaves the case file\'s folder; {RELATIVE}'),
        ("a/../../speed.csv", f'"a/../../speed.csv" leaves the case file\'s folder; {RELATIVE}'),
        ("speed.xlsx", f'"speed.xlsx" is no CSV file; {RELATIVE}'),
    ],
)
def test_refused_places(refusal: Callable[..., str], file: str, message: str) -> None:
    assert refusal(table(file=file)) == f"{F}:16: wall.upper.speed.file: {message}"


LISTS = 'speed = { kind = "table", times = [0, 1], values = [0, 2], time_unit = "s", unit = "m/s" }'


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("[0, 1]", "[1, 0]", "times: row 2 goes back in time, from 1 s to 0 s"),
        ("[0, 1]", "[0, 1, 2]", "values: there are 3 times and 2 values; both need the same number"),
        ("[0, 1]", "[]", "times: an empty list is no list of numbers; a list is needed, such as [0, 0.5, 1]"),
        ("[0, 1]", '[0, "1 s"]', 'times.2: "1 s" is no finite number; '
               'plain numbers are needed, with their unit in time_unit'),
        ("[0, 2]", "[0, nan]", "values.2: nan is no finite number; plain numbers are needed, with their unit in unit"),
        ("times = [0, 1], ", "", "times: is missing; a list of numbers is needed, or a file"),
        (', time_unit = "s"', "", 'time_unit: is missing; unit of the times is needed, such as "s"'),
        (', unit = "m/s"', "", 'unit: is missing; unit of the values is needed, such as "m/s"'),
        ('unit = "m/s"', 'unit = "kg"', 'unit: "kg" is the unit of a mass; '
               'the unit of a speed is needed, such as "m/s"'),
        ('"table"', '"table", file = "speed.csv"',
         "times: is given beside file; either a file or times and values are needed"),
        ('"table"', '"table", column = 2', "column: is given without file; it names a column of a CSV file"),
        ('"table"', '"table", interpolation = "spline"',
         'interpolation: "spline" is not known here; "linear" or "smooth" is needed'),
        ("[0, 2]", "[0, 1e30]", "values: row 2 is outside the range taken, up to 1e+08 m/s"),
    ],
)  # fmt: skip
def test_refused_lists(refusal: Callable[..., str], old: str, new: str, message: str) -> None:
    assert old in LISTS
    assert refusal({SPEED: LISTS.replace(old, new)}) == f"{F}:16: wall.upper.speed.{message}"


def test_a_column_that_is_not_there(refusal: Callable[..., str], write: Callable[..., str]) -> None:
    write("time,speed\n0,0\n1,1\n", "speed.csv")
    assert refusal(table(', column = "sped"')) == (
        f'{F}:16: wall.upper.speed.column: speed.csv has no column "sped"; did you mean "speed"?'
    )
    assert refusal(table(", column = 1.5")).endswith(
        'column: 1.5 is no column; a header name or a number from 1 is needed, such as "speed"'
    )


def test_a_dict_has_no_folder() -> None:
    speed = {"kind": "table", "file": "speed.csv", "time_unit": "s", "unit": "m/s"}
    tree = {
        "gap": {"shape": "plates", "height": "1 mm"},
        "fluid": {"density": "1000 kg/m^3", "viscosity": "1 mPa*s"},
        "wall": {"upper": {"speed": speed}},
    }
    with pytest.raises(CaseError) as caught:
        Case(tree)
    assert str(caught.value) == (
        'wall.upper.speed.file: "speed.csv" has no folder to be read from; '
        "give times and values, or read the case from a file"
    )


def test_a_long_table_is_read_and_written_in_one_pass(read: Callable[..., Case], write: Callable[..., str]) -> None:
    """Twenty thousand rows come back exactly; places of keys are looked up without quadratic work."""
    rng = np.random.default_rng(4)
    times = np.cumsum(rng.uniform(0.1, 1.0, 20_000))
    write(
        "\n".join(f"{t!r},{v!r}" for t, v in zip(times.tolist(), rng.normal(size=20_000).tolist(), strict=True)),
        "speed.csv",
    )
    case = read(table())
    name = write(case.text() + "colour = 3\n", "again.toml")
    with pytest.raises(CaseError, match=r"run\.colour: unknown key"):
        read_case(name)
    assert read_case(write(case.text(), "again.toml")) == case
