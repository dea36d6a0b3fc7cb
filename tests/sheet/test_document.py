"""The calculation sheet: what stands in it, that it is one safe page, that no number is lost on the way."""

from __future__ import annotations

import re
import subprocess
import sys
from html.parser import HTMLParser
from pathlib import Path

import pytest
from made import sudden_start
from test_figures import changed

from transient.result.result import Result, ResultError
from transient.sheet.document.blocks import Answer, Sheet, Table
from transient.sheet.document.checks import margin
from transient.sheet.document.compose import compose
from transient.sheet.document.facts import Facts, number, printed, share
from transient.sheet.document.letters import broken, width
from transient.sheet.document.page import html
from transient.sheet.document.write import write_sheet
from transient.sheet.drives import drive_words, shortened

PARTS = [
    "Purpose", "Answer", "The gap", "Inputs", "Equations and assumptions", "Does the model apply?", "Numerical error",
    "Input uncertainty", "Hand formulas beside it", "Figures", "Cautions", "Record", "Signed",
]  # fmt: skip
VOID = {"meta", "br", "hr", "img", "link", "input"}


class Page(HTMLParser):
    """Tags in balance, ids, text outside of drawings, and all that points elsewhere."""

    def __init__(self, text: str):
        super().__init__()
        self.open: list[str] = []
        self.ids: list[str] = []
        self.tags: set[str] = set()
        self.away: list[str] = []
        self.words: list[str] = []
        self.feed(text)
        self.close()

    def handle_starttag(self, tag, attrs):
        if tag not in VOID:
            self.open.append(tag)
        self._look(tag, attrs)

    def handle_startendtag(self, tag, attrs):
        self._look(tag, attrs)

    def _look(self, tag, attrs):
        self.tags.add(tag)
        for name, value in attrs:
            if name == "id":
                self.ids.append(value)
            inside = value is None or value.startswith(("#", "data:image/png;"))
            if name in ("src", "href", "xlink:href", "action", "data") and not inside:
                self.away.append(f"{tag} {name}={value}")
            if name.startswith("on"):
                self.away.append(f"{tag} {name}")

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        if "svg" not in self.open and "style" not in self.open:
            self.words.append(data)

    @property
    def text(self) -> str:
        return " ".join(" ".join(self.words).split())


def facts(result: Result, name: str = "made.h5", **more) -> Facts:
    return Facts(result, name, **more)


@pytest.fixture
def undrawn(monkeypatch):
    """Sheets without their drawings, which take most of the time."""
    for name in ("pictures", "sketch"):
        monkeypatch.setattr(f"transient.sheet.document.compose.{name}", lambda facts: ())


def table(sheet: Sheet, title: str, which: int = 0) -> Table:
    (section,) = (section for section in sheet.sections if section.title == title)
    return [block for block in section.blocks if isinstance(block, Table)][which]


@pytest.fixture(scope="module")
def page(solved) -> str:
    return html(facts(solved("flow_cell"), "flow_cell.h5"))


def test_the_page_is_whole_and_points_nowhere(page: str):
    read = Page(page)
    assert read.open == []
    assert read.away == []
    assert not read.tags & {"script", "link", "iframe", "object", "embed", "img", "form"}
    assert len(read.ids) == len(set(read.ids))
    urls = set(re.findall(r"https?://[^\"'\s<)]+", page))
    assert urls <= {"http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"}  # names of SVG's own language
    assert "@import" not in page
    assert len(page.encode()) < 2_000_000


def test_the_check_of_the_page_sees_planted_faults():
    assert Page("<img src='http://a.b/c.png'>").away == ["img src=http://a.b/c.png"]
    assert Page("<p onclick='x()'>a</p>").away == ["p onclick"]
    with pytest.raises(AssertionError):
        Page("<p><b>a</p></b>")


def test_what_is_referred_to_inside_a_drawing_is_there(page: str):
    ids = set(Page(page).ids)
    used = set(re.findall(r"url\(#([^)]+)\)", page)) | set(re.findall(r'href="#([^"]+)"', page))
    assert used
    assert used <= ids


def test_every_part_is_there_in_order(page: str):
    titles = re.findall(r"<h2><span class=\"count\">\d+</span> ([^<]+)</h2>", page)
    assert titles == PARTS
    for name in ("sketch", "stress", "flow", "profiles", "lines", "energy", "trust"):
        assert f'id="figure-{name}"' in page
    assert 'id="figure-motion"' not in page  # no body moves in this case


def test_the_answer_is_the_summary_s(solved, page: str):
    text = Page(page).text
    result = solved("flow_cell")
    assert "294.87 ± 0.01 ms" in text
    assert "−1.5139 ± 0.0001 Pa" in text
    assert f"{result.walls['upper'].peak_force * 1e3:.4f}".replace("-", "−") in text
    assert "No safety factor is included." in text
    assert "licensed practitioner" in text
    assert "laminar, one-dimensional and fully developed" in text


@pytest.mark.usefixtures("undrawn")
def test_inputs_stand_as_typed_and_in_si(solved):
    rows = {key: (typed, si) for key, typed, si in table(compose(facts(solved("cold_oil_line"))), "Inputs").rows}
    assert rows["gap.diameter"] == ("12 mm", "0.012 m")
    assert rows["pressure.drop.to"] == ("3 bar", "300000 Pa")
    assert rows["run.duration"] == ("auto", "")


@pytest.mark.usefixtures("undrawn")
@pytest.mark.parametrize("case", ["flow_cell", "cold_oil_line", "pushed_carriage"])
def test_each_check_has_value_limit_margin_and_source(solved, case: str):
    result = solved(case)
    sheet = compose(facts(result))
    rows = [*table(sheet, "Does the model apply?").rows, *table(sheet, "Numerical error", 1).rows]
    assert sorted(row[0] for row in rows) == sorted(check["name"] for check in result.summary["checks"])
    for row in rows:
        (check,) = (check for check in result.summary["checks"] if check["name"] == row[0])
        assert number(check["value"]) == row[2]
        assert number(check["limit"]) == row[3]
        assert check["source"] in row[5]
        assert row[4].startswith("×") or row[4] == "all"


@pytest.mark.parametrize(
    ("value", "limit", "status", "words"),
    [
        (0.5, 2.0, "pass", "× 4"), (3.0, 2.0, "caution", "× 0.67"), (4e-5, 1e-6, "pass", "× 40"),
        (5e-7, 1e-6, "caution", "× 0.5"), (1e-9, 1.0, "pass", "× > 1000"), (0.0, 1.0, "pass", "all"),
        (1.0, None, "pass", "–"), (0.9, 1.0, "caution", "× 1.1"),
    ],
)  # fmt: skip
def test_a_margin_is_how_often_the_value_fits_the_limit(value, limit, status, words):
    assert margin({"value": value, "limit": limit, "status": status}) == words


@pytest.mark.usefixtures("undrawn")
def test_factored_and_unfactored_stand_apart(solved):
    plain = Page(html(facts(solved("flow_cell")))).text
    both = Page(html(facts(solved("flow_cell"), factor=1.5))).text
    peak = solved("flow_cell").walls["upper"].peak_force
    assert "factored" not in plain
    for value in (peak, 1.5 * peak):
        assert f"{1e3 * value:.4f}".replace("-", "−") in both
    assert "factored × 1.5" in both
    assert "--factor 1.5" in both  # in the command that makes the sheet again


@pytest.mark.usefixtures("undrawn")
def test_hand_formulas_stand_beside_the_answer(solved):
    rows = {row[0]: row[1:] for row in table(compose(facts(solved("flow_cell"))), "Hand formulas beside it").rows}
    assert rows["peak stress, upper"] == ("−0.3757 Pa", "−1.514 Pa", "75 %")
    # h^2/(pi^2 nu) of plane Couette flow (White, Viscous Fluid Flow; from memory): 64.59 ms here
    by_hand, _, apart = rows["time constant of the decay"]
    assert by_hand == "64.59 ms"
    assert abs(float(apart.rstrip(" %").replace("−", "-"))) < 0.1
    pipe = {row[0]: row[1:] for row in table(compose(facts(solved("cold_oil_line"))), "Hand formulas beside it").rows}
    assert abs(float(pipe["time constant of the decay"][2].rstrip(" %").replace("−", "-"))) < 0.5


@pytest.mark.usefixtures("undrawn")
def test_the_case_and_the_commands_run_again(solved, tmp_path: Path):
    from transient.case.read import read_case

    result = solved("rod_flush")
    page = Page(html(facts(result, "rod_flush.h5"))).text
    assert "transient run rod_flush.toml" in page
    assert " ".join(result.case_text.split()) in page
    (tmp_path / "rod_flush.toml").write_text(result.case_text, encoding="utf-8")
    assert read_case(tmp_path / "rod_flush.toml").text() == result.case_text
    assert "transient run 'my case.toml'" in Page(html(facts(result, "my case.h5"))).text


@pytest.mark.usefixtures("undrawn")
def test_titles_notes_and_cases_are_escaped(solved):
    result = solved("flow_cell")
    evil = "<script>alert('&')</script>"
    other = Result(result.variables, {**result.summary, "title": evil}, f"# {evil}\n", {"title": evil, "program": evil})
    page = html(facts(other, f"{evil}.h5", note=f"{evil} note"))
    read = Page(page)
    assert "script" not in read.tags
    assert read.text.count(evil) >= 5
    assert "&lt;script&gt;" in page


@pytest.mark.usefixtures("undrawn")
def test_an_infinite_stress_is_said_and_not_numbered(solved):
    (box,) = [b for s in compose(facts(solved("sudden_start"))).sections for b in s.blocks if isinstance(b, Answer)]
    rows = {row[0]: row[1:] for row in box.rows}
    assert rows["Largest stress, upper"][0] == "unbounded"
    assert "K/√t with K = 0.1693" in rows["Largest stress, upper"][1]
    assert "Largest force, upper" not in rows


@pytest.mark.usefixtures("undrawn")
@pytest.mark.parametrize(("verdict", "words"), [("failed", "A SELF-CHECK FAILED"), ("outside", "OUTSIDE what")])
def test_a_bad_verdict_leads_the_answer(solved, verdict: str, words: str):
    result = solved("flow_cell")
    text = Page(html(facts(changed(result, {**result.summary, "verdict": verdict})))).text
    assert text.index(words) < text.index("Settling time")


def test_a_result_without_a_readable_case_still_has_a_sheet():
    sheet = compose(facts(sudden_start()))
    assert [section.title for section in sheet.sections] == [title for title in PARTS if title != "The gap"]
    assert "this version does not read it" in Page(html(facts(sudden_start()))).text


@pytest.mark.parametrize("case", ["pushed_carriage"])
def test_other_cases_have_whole_pages(solved, case: str):
    read = Page(html(facts(solved(case))))
    assert read.open == []
    assert len(read.ids) == len(set(read.ids))
    assert "None" not in read.text
    assert "nan" not in read.text.replace("nano", "")


def test_the_pdf_has_every_part_and_all_that_a_reader_needs(solved, tmp_path: Path):
    path = tmp_path / "sheet.pdf"
    write_sheet(solved("pushed_carriage"), path)
    raw = path.read_bytes()
    assert raw.startswith(b"%PDF")
    assert raw.count(b"/Type /Page\n") + raw.count(b"/Type /Page ") >= 6
    assert len(raw) < 2_000_000


@pytest.mark.usefixtures("undrawn")
@pytest.mark.parametrize("title", ["cost $5 of $x_{", "<b>&amp;</b>", "\u8fd0\u52a8", "a" * 300])
def test_a_title_is_only_text_on_paper_too(solved, tmp_path: Path, title: str):
    result = solved("flow_cell")
    other = Result(result.variables, {**result.summary, "title": title}, result.case_text, {"title": title})
    write_sheet(other, tmp_path / "t.pdf", f"{title[:20]}.h5", note=title)
    assert (tmp_path / "t.pdf").read_bytes().startswith(b"%PDF")


@pytest.mark.usefixtures("undrawn")
def test_nothing_leaves_the_printed_page(solved):
    from matplotlib.backends.backend_agg import FigureCanvasAgg

    from transient.sheet.document.paper import _laid_out

    result = solved("pushed_carriage")
    title = {"title": "word " * 60}
    long = Result(result.variables, {**result.summary, **title}, result.case_text, title)
    paper = _laid_out(compose(facts(long, "n" * 150 + ".h5")))
    for figure in paper.pages:
        figure.set_dpi(360)  # fine enough for letters to have their true widths
        renderer = FigureCanvasAgg(figure).get_renderer()
        for text in figure.texts:
            box = text.get_window_extent(renderer)
            assert box.x1 <= figure.bbox.x1 - 0.6 * 360, text.get_text()
            assert box.y0 >= 0.4 * 360, text.get_text()


def test_lines_break_at_blanks_and_fit():
    words = "the quick brown fox " * 6 + "x" * 200
    lines = broken(words, 9.0, 2.0)
    assert all(width(line, 9.0) <= 2.0 for line in lines)
    assert " ".join(lines).replace(" ", "") == words.replace(" ", "")
    assert broken("  indented", 9.0, 5.0) == ["  indented"]
    assert broken("", 9.0, 5.0) == [""]


def test_histories_in_words():
    assert drive_words("5 kPa") == "5 kPa from t = 0 on"
    assert drive_words({"kind": "ramp", "to": "0.3 m/s", "over": "50 ms"}) == "ramp (to 0.3 m/s, over 50 ms)"
    assert drive_words({"kind": "table", "times": [0, 1], "values": [0, 1]}) == "table of 2 rows"
    part = {"kind": "half_sine", "amplitude": "1 m/s", "over": "1 s"}
    assert drive_words({"kind": "repeat", "part": part, "every": "2 s", "times": 3}) == (
        "every 2 s, 3 times: half sine (amplitude 1 m/s, over 1 s)"
    )
    assert drive_words({"kind": "sum", "parts": [part, "1 m/s"]}).endswith("plus 1 m/s from t = 0 on")
    assert shortened("a long text that goes on", 12) == "a long …"


def test_numbers_are_set_as_print_sets_them():
    assert number(1.72e-5) == "1.72·10⁻⁵"
    assert number(-0.25) == "−0.25"
    assert number(123456.0) == "1.23·10⁵"
    assert number(0.0) == "0"
    assert share(5.9e-8) == "5.9·10⁻⁶ %"
    assert printed("34.8 us") == "34.8 µs"
    assert printed("45.98 mm^2/s") == "45.98 mm²/s"
    assert printed("4e-05 m") == "4·10⁻⁵ m"


@pytest.mark.parametrize("name", ["a.docx", "sheet"])
def test_another_ending_is_refused(solved, tmp_path: Path, name: str):
    with pytest.raises(ResultError, match=r"a sheet ends in \.html or \.pdf"):
        write_sheet(solved("flow_cell"), tmp_path / name)
    assert list(tmp_path.iterdir()) == []


def test_the_template_travels_with_the_package():
    import tomllib
    from importlib.resources import files

    folder = files("transient.sheet.document") / "templates"
    assert {path.name for path in folder.iterdir()} == {"sheet.html", "sheet.css"}
    root = Path(__file__).parents[2]
    data = tomllib.loads((root / "pyproject.toml").read_text(encoding="utf-8"))["tool"]["setuptools"]["package-data"]
    assert data["transient.sheet.document"] == ["templates/*"]


def test_the_template_engine_waits_until_a_sheet_is_written():
    code = "import sys, transient.sheet.figures, transient.sheet.document.write; sys.exit('jinja2' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
