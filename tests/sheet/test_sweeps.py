"""Figures and sheets of sweeps: a small one that is solved, and columns made by hand."""

from __future__ import annotations

import tomllib
from pathlib import Path

import numpy as np
import pytest
from test_document import Page, facts, undrawn  # noqa: F401
from test_figures import marked, overlap, texts

import transient as tr
from transient.result.result import Result, ResultError, Variable
from transient.result.store import read, write
from transient.sheet.document.blocks import Answer, Listing, Table
from transient.sheet.document.compose import compose
from transient.sheet.document.page import html
from transient.sheet.document.write import write_sheet
from transient.sheet.figures import SWEEP_FIGURES, default, draw
from transient.sheet.sweeps.columns import by_group, drawn, key_of, stepped, worst

CASE = Path(__file__).parents[2] / "cases" / "flow_cell.toml"


@pytest.fixture(scope="module")
def sweep(tmp_path_factory: pytest.TempPathFactory) -> Result:
    """Gaps by viscosities, three samples of the ramp at each, as it comes back from its file."""
    path = tmp_path_factory.mktemp("sweep") / "small.h5"
    table = tr.sweep(
        CASE, vary={"gap.height": ["0.6 mm", "0.8 mm", "1 mm"], "fluid.viscosity": ["1 mPa*s", "1.3 mPa*s"]},
        scatter={"samples": 3, "seed": 1, "wall.upper.speed.over": {"uniform": ["45 ms", "55 ms"]}}, workers=1,
    )  # fmt: skip
    write(table, path)
    return read(path)


def made(values: np.ndarray, **columns: np.ndarray) -> Result:
    """A sweep whose number ``settling_time`` has ``values`` (n,), over ``columns`` (n,)."""
    variables = {"case": Variable(("case",), np.arange(len(values)), "1", "case")}
    varied = {}
    for name, data in columns.items():
        name = name.replace("__", ".")
        variables[name] = Variable(("case",), data, "m", name)
        varied[name] = {"unit": "m", "dimension": "length", "count": len(np.unique(data))}
    variables["settling_time"] = Variable(("case",), values, "s", "settling time")
    headlines = {"settling_time": {"unit": "s"}}
    return Result(variables, {"varied": varied, "headlines": headlines}, "", {"title": "made"})


@pytest.mark.parametrize("name", SWEEP_FIGURES)
def test_every_figure_is_complete_and_clear(sweep: Result, name: str):
    figure = draw(sweep, name)
    assert overlap(figure) == []
    assert figure.get_figheight() <= 10.0


def test_keys_and_the_figure_that_shows_most(sweep: Result):
    assert stepped(sweep) == ["gap.height", "fluid.viscosity"]
    assert drawn(sweep) == ["wall.upper.speed.over"]
    assert default(sweep) == "map"
    assert default(made(np.ones(3), gap__height=np.array([1.0, 2.0, 3.0]))) == "spread"


def test_a_cell_of_the_map_is_the_largest_of_its_cases(sweep: Result):
    figure = draw(sweep, "map", quantity="peak_stress_upper")
    cells = {
        (round(t.get_position()[0], 3), round(t.get_position()[1], 3)): t.get_text()
        for t in figure.axes[0].texts if t.get_gid() == "cell"
    }  # fmt: skip
    assert len(cells) == 6
    for (height, viscosity), text in cells.items():
        there = np.isclose(sweep.variables["gap.height"].data, 1e-3 * height)
        there &= np.isclose(sweep.variables["fluid.viscosity"].data, 1e-3 * viscosity)
        values = sweep.peak_stress_upper[there]
        assert len(values) == 3
        assert text == f"{values[np.argmax(np.abs(values))]:.3g}".replace("-", "\N{MINUS SIGN}")
    assert any("the largest of 3 cases" in text for text in texts(figure))


def test_cells_without_an_answer_and_unreliable_ones_are_marked():
    height, width = np.meshgrid([1e-3, 2e-3, 3e-3], [1e-2, 2e-2])
    values = np.arange(6.0) + 1.0
    values[4] = np.nan
    result = made(values, gap__height=height.ravel(), gap__width=width.ravel())
    verdict = np.array(["good", "outside", "good", "failed", "", "good"])
    result.variables["verdict"] = Variable(("case",), verdict, "1", "verdict")
    figure = draw(result, "map")
    (crosses,) = marked(figure, "unreliable")
    np.testing.assert_allclose(sorted(crosses.get_xydata().tolist()), [[1.0, 20.0], [2.0, 10.0]])
    assert any("hatched: no case solved" in text for text in texts(figure))
    assert sum(t.get_gid() == "cell" for t in figure.axes[0].texts) == 5


def test_a_fine_map_has_contours_and_even_ratios_a_logarithmic_axis():
    height, width = np.meshgrid(np.geomspace(1e-4, 1e-2, 15), np.linspace(1e-2, 2e-2, 12))
    result = made((height * width).ravel(), gap__height=height.ravel(), gap__width=width.ravel())
    axes = draw(result, "map").axes[0]
    assert (axes.get_xscale(), axes.get_yscale()) == ("log", "linear")
    assert not [t for t in axes.texts if t.get_gid() == "cell"]
    assert [type(c).__name__ for c in axes.collections].count("QuadContourSet") == 1


def test_the_spread_is_that_of_the_cases_at_each_value():
    rng = np.random.default_rng(3)
    steps = np.repeat([1e-3, 2e-3, 3e-3], 50)
    values = steps * (1.0 + 0.1 * rng.normal(size=150))
    figure = draw(made(values, gap__height=steps), "spread")
    (median,) = marked(figure, "median")
    expected = [1e3 * np.median(values[steps == step]) for step in (1e-3, 2e-3, 3e-3)]
    np.testing.assert_allclose(median.get_ydata(), expected)
    assert {"least", "5 %", "median", "95 %", "greatest"} <= set(texts(figure))
    assert overlap(figure) == []


def test_over_a_random_key_each_case_is_a_point(sweep: Result):
    figure = draw(sweep, "spread", quantity="settling_time", over=["wall.upper.speed.over"])
    (points,) = marked(figure, "cases")
    assert len(points.get_xdata()) == 18
    np.testing.assert_allclose(points.get_xdata(), 1e3 * sweep.variables["wall.upper.speed.over"].data)


def test_chance_alone_is_a_distribution():
    values = np.random.default_rng(0).normal(2.0, 0.1, 400)
    figure = draw(made(values), "spread")
    assert overlap(figure) == []
    places = {line.get_gid(): line.get_xdata()[0] for line in marked(figure, "percentile")}
    for level in (5, 50, 95):
        assert places[f"percentile {level}"] == pytest.approx(np.percentile(values, level))


def test_the_ranking_is_the_summary_s(sweep: Result):
    figure = draw(sweep, "ranking", quantity="settling_time")
    found = sweep.summary["headlines"]["settling_time"]["sensitivities"]
    bars = figure.axes[0].patches
    np.testing.assert_allclose([bar.get_width() for bar in bars], [100.0 * one["share"] for one in found])
    assert [t.get_text() for t in figure.axes[0].get_yticklabels()] == [one["key"] for one in found]


def test_groups():
    values, groups = np.array([1.0, -3.0, 2.0, np.nan, np.nan]), np.array([0, 0, 1, 1, 2])
    np.testing.assert_array_equal(worst(values, groups, 4), [-3.0, 2.0, np.nan, np.nan])
    np.testing.assert_array_equal(by_group(values, groups, 3, lambda v: np.array([v.sum()]))[:, 0], [-2.0, 2.0, np.nan])


@pytest.mark.parametrize(
    ("name", "options", "words"),
    [
        ("stress", {}, "this file holds a sweep, of which there are map, spread, ranking"),
        ("mapp", {}, "there is no figure 'mapp'; did you mean 'map'"),
        ("map", {"quantity": "peak"}, "a sweep has no number 'peak'"),
        ("map", {"over": ["gap.height"]}, "needs two keys"),
        ("map", {"over": ["gap.height", "gap.width"]}, "nothing varies under the name 'gap.width'"),
        ("spread", {"over": ["gap.height", "fluid.viscosity"]}, "takes one key"),
        ("ranking", {"quantity": "peak"}, "there is none for 'peak'"),
    ],
)
def test_what_cannot_be_shown_is_one_line(sweep: Result, name: str, options: dict, words: str):
    with pytest.raises(ResultError, match=words) as caught:
        draw(sweep, name, **options)
    assert "\n" not in str(caught.value)


def test_a_key_without_steps_makes_no_map():
    many = made(np.arange(300.0), gap__height=np.arange(300.0))
    with pytest.raises(ResultError, match="has 300 values; a map needs one with steps"):
        key_of(many, "gap.height")


def test_the_sheet_of_a_sweep(sweep: Result):
    sheet = compose(facts(sweep, "small.h5", factor=2.0))
    titles = [section.title for section in sheet.sections]
    assert titles == [
        "Purpose", "Answer", "Worst corner", "What varies", "Spread", "Which inputs matter",
        "Equations and assumptions", "Checks, case by case", "Numerical error", "Input uncertainty", "Figures",
        "Cautions", "Record", "Signed",
    ]  # fmt: skip
    blocks = {section.title: section.blocks for section in sheet.sections}
    (box,) = [block for block in blocks["Answer"] if isinstance(block, Answer)]
    assert box.verdict == "18 of 18 cases solved."
    rows = {row[0]: row[1] for row in box.rows}
    force = sweep.summary["headlines"]["peak_force_upper"]["worst"]["value"]
    assert rows["Peak force, upper"] == f"{1e3 * force:.4g} mN".replace("-", "\N{MINUS SIGN}")
    assert f"{2e3 * force:.4g} mN".replace("-", "\N{MINUS SIGN}") in [row[1] for row in box.rows]
    (table,) = [block for block in blocks["What varies"] if isinstance(block, Table)][:1]
    assert [row[0] for row in table.rows] == ["gap.height", "fluid.viscosity", "wall.upper.speed.over"]
    page = Page(html(facts(sweep, "small.h5")))
    assert page.open == []
    assert page.away == []
    assert len(page.ids) == len(set(page.ids))


def test_the_sweep_file_in_the_record_says_the_same(sweep: Result):
    (record,) = [s for s in compose(facts(sweep, "small.h5")).sections if s.title == "Record"]
    listings = [block.text for block in record.blocks if isinstance(block, Listing)]
    tree = tomllib.loads(listings[-1])
    assert tree["case"] == "small_case.toml"
    assert tree["vary"]["gap.height"] == ["0.6 mm", "0.8 mm", "1 mm"]
    assert tree["scatter"]["samples"] == 3
    assert tomllib.loads(listings[1])["gap"]["shape"] == "plates"


def test_the_worst_corner_runs_by_itself(sweep: Result):
    from transient.case.read import read_case

    (corner,) = [s for s in compose(facts(sweep, "small.h5")).sections if s.title == "Worst corner"]
    (command,) = [block.text for block in corner.blocks if isinstance(block, Listing)]
    import shlex

    words = shlex.split(command)
    assert words[:3] == ["transient", "run", "small_case.toml"]
    sets = [tuple(word.split("=", 1)) for word in words[4::2]]
    case = read_case(CASE, sets)
    found = sweep.summary["headlines"]["settling_time"]["worst"]
    result = tr.run(case)
    error = result.settling.error + float(sweep.settling_error[found["case"]])
    assert result.settling.time == pytest.approx(found["value"], abs=2.0 * error)


def test_a_sweep_with_cases_that_failed_says_so(sweep: Result):
    summary = {
        **sweep.summary, "status": {"solved": 16, "refused": 1, "failed": 1}, "verdicts": {"good": 15, "outside": 1},
        "messages": [{"message": "<b>no</b>", "cases": 2, "first": 3}],
    }  # fmt: skip
    other = Result(sweep.variables, summary, sweep.case_text, sweep.attributes)
    page = Page(html(facts(other)))
    assert "16 of 18 cases solved; 1 refused; 1 failed; 1 outside what the model describes." in page.text
    assert "<b>no</b>" in page.text
    assert "b" not in page.tags


@pytest.mark.usefixtures("undrawn")
def test_a_run_s_sheet_takes_its_input_uncertainty_from_a_sweep(sweep: Result, solved, tmp_path: Path):
    result = solved("flow_cell")
    write_sheet(result, tmp_path / "a.html", "flow_cell.h5", sweep=sweep, sweep_name="runs/small.h5")
    text = Page((tmp_path / "a.html").read_text(encoding="utf-8")).text
    part = sweep.summary["headlines"]["settling_time"]
    for level in ("5", "95"):
        assert f"{1e3 * part['percentiles'][level]:.4g} ms" in text
    assert "From 18 cases of the same case with its inputs varied (small.h5)" in text
    assert "transient sheet outputs/flow_cell.h5 --sweep outputs/small.h5" in text
    for other, more, words in (
        (solved("cold_oil_line"), sweep, "varies another case than this result's"),
        (result, result, "holds a single run; the result of a sweep is needed"), (sweep, sweep, "is that of a sweep"),
    ):  # fmt: skip
        with pytest.raises(ResultError, match=words):
            write_sheet(other, tmp_path / "b.html", sweep=more)
    assert not (tmp_path / "b.html").exists()


def test_the_sheet_of_a_sweep_as_pdf(sweep: Result, tmp_path: Path):
    write_sheet(sweep, tmp_path / "sweep.pdf")
    assert (tmp_path / "sweep.pdf").read_bytes().startswith(b"%PDF")
