"""``transient sheet``, ``run --sheet`` and the options of ``figure``: files, words and exit codes."""

from __future__ import annotations

from pathlib import Path

import h5py
import pytest


def test_a_sheet_lies_beside_the_result(call, finished):
    said = call("sheet", finished)
    path = finished.with_suffix(".html")
    assert (said.status, said.out, said.err) == (0, "", f"wrote {path}\n")
    text = path.read_text(encoding="utf-8")
    assert text.startswith("<!doctype html>")
    assert f"transient sheet outputs/{finished.name}" in text
    path.unlink()


def test_a_sheet_with_factor_note_and_place(call, finished, tmp_path):
    target = tmp_path / "page.html"
    said = call("sheet", finished, "--out", target, "--factor", "1.5", "--note", "for <rig> 3")
    assert said.status == 0
    text = target.read_text(encoding="utf-8")
    assert "factored × 1.5" in text
    assert "for &lt;rig&gt; 3" in text


@pytest.mark.parametrize("arguments", [["--pdf"], ["--out"]])
def test_a_sheet_as_pdf(call, finished, tmp_path, arguments):
    target = tmp_path / "page.pdf" if arguments == ["--out"] else finished.with_suffix(".pdf")
    said = call("sheet", finished, *arguments, *([target] if arguments == ["--out"] else []))
    assert (said.status, said.err) == (0, f"wrote {target}\n")
    assert target.read_bytes().startswith(b"%PDF")
    target.unlink()


def test_run_writes_sheets_as_well(call, tmp_path):
    case = Path(__file__).parents[2] / "cases" / "cold_oil_line.toml"
    said = call("run", case, "--out", tmp_path, "--sheet", "--json")
    assert said.status == 0
    assert said.out.count("\n") == 1
    assert f"wrote {tmp_path / 'cold_oil_line.html'}" in said.err
    assert (tmp_path / "cold_oil_line.html").stat().st_size > 10_000
    assert (tmp_path / "cold_oil_line.h5").is_file()


def damaged(finished: Path, folder: Path, kind: str) -> Path:
    """A result file that is none, is cut short, or is of a newer schema."""
    path = folder / f"{kind}.h5"
    if kind == "text":
        path.write_text("no result", encoding="utf-8")
    elif kind == "short":
        raw = finished.read_bytes()
        path.write_bytes(raw[: len(raw) // 2])
    elif kind == "newer":
        path.write_bytes(finished.read_bytes())
        with h5py.File(path, "r+") as file:
            file.attrs["schema"] = 99
    elif kind == "foreign":
        with h5py.File(path, "w") as file:
            file["a"] = [1.0]
    return path


DAMAGE = {
    "missing": "there is no such file", "text": "is not an HDF5 file", "short": "is cut short or damaged",
    "newer": "has schema 99, newer than", "foreign": "not a result of this program",
}  # fmt: skip


@pytest.mark.parametrize("kind", DAMAGE)
@pytest.mark.parametrize("command", [["sheet"], ["figure"], ["figure", "--animate"], ["loads", "--every", "1 ms"]])
def test_what_is_no_result_is_refused_in_one_line(call, finished, tmp_path, command, kind):
    path = damaged(finished, tmp_path, kind)
    before = sorted(tmp_path.iterdir())
    said = call(command[0], path, *command[1:])
    assert (said.status, said.out) == (2, "")
    assert said.err.startswith(f"{path}: ")
    assert DAMAGE[kind] in said.err
    assert said.err.count("\n") == 1
    assert sorted(tmp_path.iterdir()) == before


def test_a_wall_that_does_not_exist_is_refused(call, finished):
    said = call("loads", finished, "--wall", "middle", "--every", "1 ms")
    assert (said.status, said.out) == (2, "")
    assert said.err == f'{finished}: there is no wall "middle"; the result has lower and upper\n'
    said = call("figure", finished, "--against", finished, "--quantity", "wall_stress middle")
    assert said.status == 2
    assert said.err.startswith("which wall? there are 'wall_stress lower' and 'wall_stress upper'")


@pytest.mark.parametrize("ending", [".html", ".svg"])
def test_a_moving_picture(call, finished, tmp_path, ending):
    target = tmp_path / f"moving{ending}"
    said = call("figure", finished, "--animate", "--out", target)
    assert (said.status, said.err) == (0, f"wrote {target}\n")
    assert "<animate" in target.read_text(encoding="utf-8")


def test_beside_a_measurement_and_another_result(call, finished, tmp_path):
    table = tmp_path / "rig.csv"
    assert call("table", finished, "--out", table).status == 0
    target = tmp_path / "beside.svg"
    said = call(
        "figure", finished, "--against", table, "--quantity", "mean_velocity", "--shift", "-2 ms", "--out", target
    )
    assert (said.status, said.err) == (0, f"wrote {target}\n")
    said = call("figure", finished, "--against", finished, "--out", tmp_path / "same.png")
    assert said.status == 0


def test_lines_laid_where_asked(call, finished, tmp_path):
    target = tmp_path / "lines.png"
    said = call("figure", finished, "lines", "--laid", "0 s", "--laid", "20 ms", "--seen", "0.2 s", "--out", target)
    assert (said.status, said.err) == (0, f"wrote {target}\n")


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["stress", "--animate"], "--animate draws a figure of its own; leave the name stress out\n"),
        (["stress", "--against", "a.csv"], "--against draws a figure of its own; leave the name stress out\n"),
        (["--animate", "--against", "a.csv"], "--animate and --against are two figures; give one of them\n"),
        (["--shift", "1 ms"], "--shift belongs to --against, such as --against measured.csv\n"),
        (["flow", "--quantity", "x"],
         "--quantity is for the figures of a sweep or with --against; this file holds a single run\n"),
        (["map"], "figure map: this file holds a single run, of which there are overview, "),
        (["--animate", "--out", "a.gif"], "--out a.gif: a moving picture ends in .html or .svg, such as a.html\n"),
        (["stress", "--laid", "0 s"],
         '--laid and --seen belong to the figure lines: transient figure RESULT.h5 lines --laid "0 s"\n'),
        (["--against", "none.csv"], "none.csv: there is no such file\n"),
        (["lines", "--laid", "9 s"], "time lines: 9 s lies outside the run's profiles, 0 s to "),
        (["lines", "--seen", "9 kg"], '--seen: "9 kg" is a mass'),
    ],
)  # fmt: skip
def test_options_that_do_not_go_together_are_refused_in_one_line(call, finished, arguments, message):
    said = call("figure", finished, *arguments)
    assert (said.status, said.out) == (2, "")
    assert said.err.startswith(message)
    assert said.err.count("\n") == 1
