"""The moving picture: one whole file that points nowhere, with a shape for every instant."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from pathlib import Path

import numpy as np
import pytest
from test_figures import changed

from transient.result.result import Result, ResultError, Variable
from transient.sheet.moving import FRAMES, GAP, moving, write_moving
from transient.sheet.ticks import decades, steps, ticks

SVG = "{http://www.w3.org/2000/svg}"


def shapes(drawing: ET.Element) -> list[list[str]]:
    """Values of every animated shape."""
    return [a.get("values").split(";") for a in drawing.iter(f"{SVG}animate") if a.get("attributeName") == "d"]


@pytest.mark.parametrize("case", ["flow_cell", "cold_oil_line", "sudden_start", "reversing_rig", "spun_sleeve"])
def test_it_is_whole_and_small(solved, case: str):
    text = moving(solved(case))
    drawing = ET.fromstring(text)
    assert len(text) < 500_000
    assert "nan" not in text
    assert not re.findall(r"<script|href=|src=|https?://(?!www\.w3\.org/2000/svg)", text)
    for values in shapes(drawing):
        assert len(values) == FRAMES
        assert len({value.count("L") for value in values}) == 1  # else a browser cannot go from one to the next


def test_the_tip_of_the_profile_follows_the_wall(solved):
    """A wall ramped up over 50 ms of 735 ms: half way after 25 ms, and at its speed from then on."""
    drawing = ET.fromstring(moving(solved("flow_cell")))
    profile = shapes(drawing)[1]
    tips = np.array([float(shape.split("L")[-1].split()[0]) for shape in profile])
    x = (tips - tips[0]) / (tips[-1] - tips[0])
    time = np.linspace(0.0, solved("flow_cell").profile_time[-1], FRAMES)
    np.testing.assert_allclose(x, np.minimum(time / 50e-3, 1.0), atol=0.02)
    assert GAP[0] < tips[0] < tips[-1] < GAP[2]


def test_a_standing_wall_does_not_move(solved):
    drawing = ET.fromstring(moving(solved("flow_cell")))
    groups = [g for g in drawing.iter(f"{SVG}g") if g.get("clip-path", "").startswith("url(#wall")]
    assert [len(list(g.iter(f"{SVG}animateTransform"))) for g in groups] == [0, 1]


@pytest.mark.parametrize(("ending", "start"), [(".html", "<!doctype html>"), (".svg", "<svg")])
def test_files_and_titles(solved, tmp_path: Path, ending: str, start: str):
    result = solved("flow_cell")
    evil = "<script>&\"'</script>"
    other = Result(result.variables, {**result.summary, "title": evil}, "", {"title": evil})
    write_moving(other, tmp_path / f"m{ending}")
    text = (tmp_path / f"m{ending}").read_text(encoding="utf-8")
    assert text.startswith(start)
    assert "<script" not in text
    assert "&lt;script&gt;" in text


def test_what_cannot_be_moved_is_one_line(solved, tmp_path: Path):
    with pytest.raises(ResultError, match=r"ends in \.html or \.svg"):
        write_moving(solved("flow_cell"), tmp_path / "m.gif")
    with pytest.raises(ResultError, match="this file holds no travel"):
        moving(changed(solved("flow_cell"), travel=None))
    one = {
        name: Variable(v.dims, v.data[:1], v.units, v.long_name)
        for name, v in solved("flow_cell").variables.items() if v.dims[0] == "profile_time"
    }  # fmt: skip
    with pytest.raises(ResultError, match="needs profiles at two times at least"):
        moving(changed(solved("flow_cell"), **one))


def test_ticks_are_round_and_inside():
    assert ticks(0.0, 1.0) == [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]
    assert ticks(-0.3, 0.3) == [-0.3, -0.2, -0.1, 0.0, 0.1, 0.2, 0.3]
    assert ticks(20.0, 22.0) == [20.0, 20.5, 21.0, 21.5, 22.0]
    assert ticks(5.0, 5.0) == [5.0]
    assert decades(3e-3, 2.0) == [0.01, 0.1, 1.0]
    assert steps(0.3, 3.0) == [0.5, 1.0, 2.0]
    assert steps(1e-3, 1e3) == [1e-3, 1e-2, 1e-1, 1.0, 1e1, 1e2, 1e3]
