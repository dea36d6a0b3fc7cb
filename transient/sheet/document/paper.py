"""A sheet as a PDF of A4 pages, drawn by matplotlib alone: what the HTML page says, block by block."""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from transient.sheet.document.blocks import (
    Answer,
    Blanks,
    Block,
    Formula,
    Listing,
    Picture,
    Points,
    Sheet,
    Table,
    Words,
)  # fmt: skip
from transient.sheet.document.letters import broken, width
from transient.sheet.document.onto import onto
from transient.sheet.style import FAINT, SOFT, drawing

if TYPE_CHECKING:
    from matplotlib.figure import Figure

# Inches: the page, its margins, the column of text.
PAGE, LEFT, TOP, BOTTOM = (8.27, 11.69), 0.87, 0.75, 0.85
COLUMN = PAGE[0] - 2 * LEFT
INK = "#1d252c"
BODY, SMALL, HEAD, TITLE, CODE = 9.0, 8.2, 11.5, 16.0, 7.6
LEAD = 1.38 / 72.0  # height of a line per point of its size
GAP = 0.12
NARROW = 1.65  # widest column beside a wide one
_LOW = re.compile(r"(\w)_([A-Za-z]+)")  # in formulas, which are never a user's text
MARKS = {"good": ("-", 1.2), "caution": ((0, (4, 2)), 1.6), "bad": ("-", 3.0)}


class Paper:
    """Pages under way: ``y`` inches from the top of the present one."""

    def __init__(self, title: str):
        self.title = title
        self.pages: list[Figure] = []
        self.y = 0.0
        self.turn()

    def turn(self) -> None:
        """Begins a new page."""
        from matplotlib.figure import Figure

        self.pages.append(Figure(figsize=PAGE))
        self.y = TOP

    def room(self, inches: float) -> None:
        """Turns the page where less than ``inches`` are left on it."""
        if self.y + inches > PAGE[1] - BOTTOM and self.y > TOP:
            self.turn()

    def text(self, x: float, words: str, size: float = BODY, y: float | None = None, **style: Any) -> None:
        """Words with their top left corner ``x`` inches into the column, at the present height or at ``y``."""
        place = (LEFT + x) / PAGE[0], 1.0 - (self.y if y is None else y) / PAGE[1]
        usual = {"va": "top", "ha": "left", "color": INK, "parse_math": False}
        self.pages[-1].text(*place, words, size=size, **{**usual, **style})

    def rule(self, x0: float, x1: float, y: float, **style: Any) -> None:
        """A line across, from ``x0`` to ``x1`` inches of the column."""
        self.stroke([(x0, y), (x1, y)], **style)

    def stroke(self, points: list[tuple[float, float]], **style: Any) -> None:
        """A line through points (inches of the column, inches from the top)."""
        from matplotlib.lines import Line2D

        x = [(LEFT + at) / PAGE[0] for at, _ in points]
        y = [1.0 - at / PAGE[1] for _, at in points]
        self.pages[-1].add_artist(Line2D(x, y, **{"color": INK, "lw": 0.8, **style}))

    def lines(self, words: str, size: float = BODY, x: float = 0.0, room: float = COLUMN, **style: Any) -> None:
        """A paragraph from ``x`` on, broken to ``room`` inches."""
        face = "bold" if style.get("weight") == "bold" else style.get("family", "sans")
        for line in broken(words, size, room - x, face):
            self.room(size * LEAD)
            self.text(x, line, size, **style)
            self.y += size * LEAD


def write_pdf(sheet: Sheet, path: Path) -> None:
    """Writes the sheet to ``path``."""
    from matplotlib.backends.backend_pdf import PdfPages

    with drawing(), warnings.catch_warnings():
        # A title in a script that the font lacks is shown with boxes, which is no fault of the result.
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        paper = _laid_out(sheet)
        with PdfPages(path, metadata={"Title": sheet.title, "CreationDate": None}) as out:
            for number, page in enumerate(paper.pages):
                _foot(page, sheet.title, number + 1, len(paper.pages))
                out.savefig(page)


def _laid_out(sheet: Sheet) -> Paper:
    paper = Paper(sheet.title)
    paper.lines("Calculation sheet", SMALL, color=SOFT)
    paper.lines(sheet.title, TITLE, weight="bold")
    paper.y += 0.05
    paper.lines("   ·   ".join(f"{label} {text}" for label, text in sheet.facts), SMALL, color=SOFT)
    paper.y += 0.06
    paper.rule(0.0, COLUMN, paper.y, lw=1.4)
    paper.y += 0.06
    for number, section in enumerate(sheet.sections, 1):
        if section.apart:
            paper.turn()
        paper.y += 0.1
        paper.room(1.0 + _first(section.blocks[0]))
        paper.text(0.0, str(number), HEAD, color=SOFT)
        paper.text(0.3, section.title, HEAD, weight="bold")
        paper.y += HEAD * LEAD + 0.06
        for block in section.blocks:
            PRINTERS[type(block)](paper, block)
            paper.y += GAP
    return paper


def _first(block: Block) -> float:
    """Height (inches) that must follow a heading on its page."""
    return _tall(block) if isinstance(block, Picture) else 0.0


def _foot(page: Figure, title: str, number: int, count: int) -> None:
    y = 0.45 / PAGE[1]
    short = title if len(title) <= 80 else title[:79] + "…"
    page.text(LEFT / PAGE[0], y, short, size=7.5, color=SOFT, parse_math=False)
    page.text(1 - LEFT / PAGE[0], y, f"{number} of {count}", size=7.5, color=SOFT, ha="right")


def _words(paper: Paper, block: Words) -> None:
    paper.lines(block.text)


def _points(paper: Paper, block: Points) -> None:
    for item in block.items:
        paper.room(BODY * LEAD)
        paper.text(0.04, "•", BODY)
        paper.lines(item, x=0.2)
        paper.y += 0.025


def _formula(paper: Paper, block: Formula) -> None:
    size = 10.0
    lines = block.text.split(",   ")
    paper.room((size * len(lines) + SMALL) * LEAD)
    for line in lines:
        text = _LOW.sub(r"$\\mathrm{\1_{\2}}$", line)
        paper.text(0.15, text, size, family="serif", parse_math=True, math_fontfamily="dejavuserif")
        paper.y += size * LEAD
    if block.where:
        paper.lines(block.where, SMALL, x=0.15, color=SOFT)


def _listing(paper: Paper, block: Listing) -> None:
    for line in block.text.split("\n"):
        paper.lines(line or " ", CODE, x=0.15, family="monospace")


def _answer(paper: Paper, block: Answer) -> None:
    """The box: verdict, then what, value and remark in three columns."""
    places = (0.18, 2.0, 3.75)
    rows = [(what, value, broken(remark, SMALL, COLUMN - places[2] - 0.12)) for what, value, remark in block.rows]
    tall = 0.26 + sum(max(len(remark), 1) * SMALL * LEAD + 0.045 for *_, remark in rows) + 0.16
    paper.room(tall)
    top = paper.y
    paper.y += 0.1
    paper.lines(block.verdict, BODY, x=places[0], weight="bold")
    paper.y += 0.07
    for what, value, remark in rows:
        paper.text(places[0], what, SMALL + 0.3)
        paper.text(places[1], value, SMALL + 0.3, weight="bold")
        paper.text(places[2], "\n".join(remark), SMALL, color=SOFT, linespacing=1.35)
        paper.y += max(len(remark), 1) * SMALL * LEAD + 0.045
    paper.y += 0.04
    stroke, weight = MARKS.get(block.mark, ("-", 1.0))
    paper.stroke([(0, top), (COLUMN, top), (COLUMN, paper.y), (0, paper.y), (0, top)], ls=stroke, lw=weight)


def _table(paper: Paper, block: Table) -> None:
    """Columns as wide as their widest cell; the wide one takes what is left, or all share it."""
    sizes = _widths(block)
    _row(paper, block, block.head, sizes, SOFT, "normal")
    for i, row in enumerate(block.rows):
        tall = max(len(_cell(block, j, cell, sizes)) for j, cell in enumerate(row)) * SMALL * LEAD + 0.08
        if paper.y + tall > PAGE[1] - BOTTOM:
            paper.turn()
            _row(paper, block, block.head, sizes, SOFT, "normal")
        _row(paper, block, row, sizes, INK, "bold" if block.mark(i) == "bad" else "normal")


def _widths(block: Table) -> list[float]:
    gap = 0.16
    wide = block.wide if block.wide >= 0 else len(block.head) - 1
    cells = [block.head, *block.rows]
    sizes = [max(width(row[j], SMALL) for row in cells) + gap for j in range(len(block.head))]
    others = sum(size for j, size in enumerate(sizes) if j != wide)
    if block.wide >= 0 and others > 0.6 * COLUMN:
        sizes = [min(size, NARROW) for size in sizes]
        others = sum(size for j, size in enumerate(sizes) if j != wide)
    if others > 0.72 * COLUMN:
        scale = 0.72 * COLUMN / others
        sizes = [size * scale for size in sizes]
        others = 0.72 * COLUMN
    spare = COLUMN - sum(sizes)
    if block.wide < 0 < spare:
        return [size + spare / len(sizes) for size in sizes]
    sizes[wide] = COLUMN - others
    return sizes


def _cell(block: Table, column: int, cell: str, sizes: list[float]) -> list[str]:
    return broken(cell, SMALL, sizes[column] - 0.12) or [""]


def _row(paper: Paper, block: Table, row: tuple[str, ...], sizes: list[float], ink: str, weight: str) -> None:
    """One row and the rule below it."""
    most, x = 1, 0.0
    for j, cell in enumerate(row):
        told = _cell(block, j, cell, sizes)
        most = max(most, len(told))
        right = j in block.numbers
        at = x + sizes[j] - 0.16 if right else x
        side = "right" if right else "left"
        paper.text(at, "\n".join(told), SMALL, color=ink, weight=weight, ha=side, linespacing=1.35)
        x += sizes[j]
    paper.y += most * SMALL * LEAD + 0.035
    paper.rule(0.0, COLUMN, paper.y, color=SOFT if ink == SOFT else FAINT, lw=0.6)
    paper.y += 0.045


def _tall(block: Picture) -> float:
    return (block.figure.get_figheight() - block.crop) + SMALL * LEAD + 0.1


def _picture(paper: Paper, block: Picture) -> None:
    """The figure, redrawn onto the page as paths, and its caption."""
    paper.room(_tall(block))
    tall = (block.figure.get_figheight() - block.crop)
    onto(paper.pages[-1], block, (LEFT, PAGE[1] - paper.y - tall))
    paper.y += tall + 0.04
    paper.lines(block.caption, SMALL, color=SOFT)


def _blanks(paper: Paper, block: Blanks) -> None:
    part = (COLUMN - 1.1) / len(block.columns)
    paper.room(0.45 * (len(block.roles) + 1))
    for i, column in enumerate(block.columns):
        paper.text(1.1 + i * part, column, SMALL, color=SOFT)
    for role in block.roles:
        paper.y += 0.45
        paper.text(0.0, role, BODY, y=paper.y - 0.16)
        for i in range(len(block.columns)):
            paper.rule(1.1 + i * part, 1.1 + (i + 1) * part - 0.2, paper.y)


PRINTERS: dict[type, Callable[[Paper, Any], None]] = {
    Words: _words,
    Points: _points,
    Formula: _formula,
    Listing: _listing,
    Answer: _answer,
    Table: _table,
    Picture: _picture,
    Blanks: _blanks,
}
