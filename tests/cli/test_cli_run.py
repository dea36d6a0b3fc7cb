"""``transient run`` from the command line to the file on disk."""

from __future__ import annotations

import json
import tempfile
from pathlib import Path

import pytest

from transient.result.store import read

CASES = Path(__file__).resolve().parents[2] / "cases"
CELL = CASES / "flow_cell.toml"
BAD = """title = "Carriage"
[gap]
shape = "plates"
height = "0.2 kg"
[fluid]
density = "998 kg/m^3"
viscosity = "1 mPa*s"
"""


@pytest.fixture
def bad(tmp_path: Path) -> Path:
    """A case file whose gap height is a mass."""
    path = tmp_path / "carriage.toml"
    path.write_text(BAD, encoding="utf-8")
    return path


def test_a_case_becomes_a_file_and_a_summary(call, tmp_path):
    said = call("run", CELL, "--out", tmp_path / "new" / "folder")
    assert said.status == 0
    result = read(tmp_path / "new" / "folder" / "flow_cell.h5")
    assert said.out.startswith("Flow cell brought up to speed\n")
    for word in ("Settled", "Wall", "lower", "upper", "Flow", "By hand", "Trust", str(tmp_path)):
        assert word in said.out
    assert max(len(line) for line in said.out.splitlines() if str(tmp_path) not in line) <= 80
    assert list((tmp_path / "new" / "folder").iterdir()) == [tmp_path / "new" / "folder" / "flow_cell.h5"]
    assert result.title == "Flow cell brought up to speed"


def test_json_is_the_stored_summary_one_line_a_case(call, tmp_path, bad):
    said = call("run", CELL, bad, CASES / "cold_oil_line.toml", "--json", "--out", tmp_path)
    lines = [json.loads(line, parse_constant=lambda word: pytest.fail(word)) for line in said.out.splitlines()]
    assert said.status == 2
    assert lines[0] == read(tmp_path / "flow_cell.h5").summary
    assert lines[1] == {
        "case": str(bad),
        "refused": f'{bad}:4: gap.height: "0.2 kg" is a mass; a length is needed, such as "0.2 mm"',
    }
    assert lines[2]["shape"] == "pipe"
    assert lines[1]["refused"] in said.err
    assert not (tmp_path / "carriage.h5").exists()


def test_a_refused_case_is_one_line_and_nothing_is_written(call, tmp_path, bad):
    said = call("run", bad, "--out", tmp_path / "out")
    assert said.status == 2
    assert said.out == ""
    assert said.err.endswith(f'{bad}:4: gap.height: "0.2 kg" is a mass; a length is needed, such as "0.2 mm"\n')
    assert not (tmp_path / "out").exists()


def test_a_missing_case_file_is_refused(call, tmp_path):
    said = call("run", tmp_path / "no.toml", "--quiet", "--out", tmp_path)
    assert said.status == 2
    assert str(tmp_path / "no.toml") in said.err
    assert said.err.count("\n") == 1


def test_set_overrides_keys_and_is_stored(call, tmp_path):
    plain = call("run", CELL, "--json", "--out", tmp_path)
    thin = call("run", CELL, "--json", "--out", tmp_path, "--set", "gap.height=0.4 mm", "--set", 'title="Thin"')
    before, after = json.loads(plain.out), json.loads(thin.out)
    assert after["title"] == "Thin"
    # Steady shear between plates: stress = viscosity x speed / height, so half the height is twice the stress.
    ratio = after["walls"]["lower"]["final_stress"] / before["walls"]["lower"]["final_stress"]
    assert ratio == pytest.approx(2.0, rel=2e-3)
    assert "0.4 mm" in read(tmp_path / "flow_cell.h5").case_text


def test_a_wrong_override_is_refused(call, tmp_path):
    said = call("run", CELL, "--quiet", "--out", tmp_path, "--set", "gap.hight=0.4 mm")
    assert said.status == 2
    assert "height" in said.err
    assert said.err.count("\n") == 1
    assert list(tmp_path.iterdir()) == []


def test_quiet_prints_nothing(call, tmp_path):
    said = call("run", CELL, "--quiet", "--out", tmp_path)
    assert (said.status, said.out, said.err) == (0, "", "")
    assert (tmp_path / "flow_cell.h5").is_file()


def test_a_former_result_is_replaced_and_an_odd_one_in_the_way_refused(call, tmp_path):
    (tmp_path / "flow_cell.h5").write_text("an old thing", encoding="utf-8")
    assert call("run", CELL, "--quiet", "--out", tmp_path).status == 0
    assert read(tmp_path / "flow_cell.h5").summary["shape"] == "plates"
    (tmp_path / "flow_cell.h5").unlink()
    (tmp_path / "flow_cell.h5").mkdir()
    said = call("run", CELL, "--out", tmp_path)
    assert said.status == 2
    way = tmp_path / "flow_cell.h5"
    assert said.err == f"{way}: is a folder where the result would go; name another folder with --out\n"


@pytest.fixture
def never_solved(monkeypatch: pytest.MonkeyPatch) -> None:
    """Fail a test that comes as far as solving."""
    import transient.answer

    monkeypatch.setattr(transient.answer, "run", lambda case: pytest.fail("solved all the same"))


@pytest.mark.usefixtures("never_solved")
class TestOutputFolder:
    """What is refused before anything is solved."""

    def test_a_file_in_its_place(self, call, tmp_path):
        (tmp_path / "out").write_text("", encoding="utf-8")
        for folder in (tmp_path / "out", tmp_path / "out" / "deeper"):
            said = call("run", CELL, "--out", folder)
            assert said.status == 2
            assert said.err == (
                f"{folder}: results go into a folder, and {tmp_path / 'out'} is a file; name another with --out\n"
            )

    def test_a_folder_that_refuses_files(self, call, tmp_path, monkeypatch):
        # As root every folder can be written, so the refusal is planted where the folder is tried.
        def refused(**_: object) -> None:
            raise PermissionError(13, "Permission denied")

        monkeypatch.setattr(tempfile, "TemporaryFile", refused)
        said = call("run", CELL, "--out", tmp_path)
        assert said.status == 2
        assert said.err == f"{tmp_path}: cannot be written (Permission denied); name another with --out\n"

    def test_two_cases_that_would_share_a_file(self, call, tmp_path):
        said = call("run", CELL, tmp_path / "flow_cell.toml", "--out", tmp_path)
        assert said.status == 2
        assert said.err == (
            f"{CELL} and {tmp_path / 'flow_cell.toml'} would both write {tmp_path / 'flow_cell.h5'}; "
            "run them apart, each with its own --out\n"
        )


def test_a_march_that_stops_says_why_and_writes_nothing(call, tmp_path, monkeypatch):
    import transient.answer
    from transient.march.march import SolveError

    def stopped(case: object) -> None:
        raise SolveError("the speed is not a number at t = 0.2 s; look at the table")

    monkeypatch.setattr(transient.answer, "run", stopped)
    said = call("run", CELL, "--json", "--out", tmp_path)
    assert said.status == 1
    assert json.loads(said.out) == {
        "case": str(CELL),
        "failed": f"{CELL}: the speed is not a number at t = 0.2 s; look at the table",
    }
    assert list(tmp_path.iterdir()) == []


def test_an_error_of_the_program_itself_spares_the_other_cases(call, tmp_path, monkeypatch):
    import transient.answer

    solve = transient.answer.run

    def broken_once(case: object) -> object:
        monkeypatch.setattr(transient.answer, "run", solve)
        raise ZeroDivisionError("planted")

    monkeypatch.delenv("TRANSIENT_DEBUG", raising=False)
    monkeypatch.setattr(transient.answer, "run", broken_once)
    said = call("run", CELL, CASES / "cold_oil_line.toml", "--quiet", "--out", tmp_path)
    assert said.status == 1
    assert said.err.startswith(f"{CELL}: transient met an error of its own (ZeroDivisionError: planted)")
    assert said.err.count("\n") == 1
    assert [path.name for path in tmp_path.iterdir()] == ["cold_oil_line.h5"]


@pytest.mark.parametrize("status", [1, 3])
def test_the_status_is_the_highest_of_all_cases(call, tmp_path, monkeypatch, status):
    import transient.answer

    statuses = iter([0, status, 0])
    monkeypatch.setattr(transient.answer, "exit_status", lambda result: next(statuses))
    names = ("flow_cell", "cold_oil_line", "rod_flush")
    said = call("run", *(CASES / f"{name}.toml" for name in names), "--quiet", "--out", tmp_path)
    assert said.status == status
