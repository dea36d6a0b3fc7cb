"""What a sheet is made of, whatever it is printed on: sections of blocks of plain text, numbers already in words."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.figure import Figure


@dataclass(frozen=True)
class Words:
    """A paragraph."""

    text: str
    kind: str = "words"


@dataclass(frozen=True)
class Points:
    """A list of short statements."""

    items: tuple[str, ...]
    kind: str = "points"


@dataclass(frozen=True)
class Formula:
    """A formula on a line of its own, and what its letters mean."""

    text: str
    where: str = ""
    kind: str = "formula"


@dataclass(frozen=True)
class Table:
    """Rows of cells; ``marks`` by row: "good", "caution", "bad" or "" (said in words in the cells as well).

    ``numbers`` are the columns set flush right, ``wide`` the one that takes what room is left.
    """

    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    marks: tuple[str, ...] = ()
    numbers: tuple[int, ...] = ()
    wide: int = -1
    kind: str = "table"

    def mark(self, row: int) -> str:
        """The mark of a row."""
        return self.marks[row] if row < len(self.marks) else ""


@dataclass(frozen=True, eq=False)
class Picture:
    """A figure with what it shows in a sentence; ``crop`` inches at its top are left out."""

    name: str
    caption: str
    figure: Figure
    crop: float = 0.0
    kind: str = "picture"


@dataclass(frozen=True)
class Listing:
    """Text in full as it is, line by line."""

    text: str
    kind: str = "listing"


@dataclass(frozen=True)
class Answer:
    """The answer in one box: (what, value, remark) rows under a verdict in words; ``mark`` as in ``Table``."""

    verdict: str
    mark: str
    rows: tuple[tuple[str, str, str], ...]
    kind: str = "answer"


@dataclass(frozen=True)
class Blanks:
    """Lines to be filled in by hand, one per role."""

    roles: tuple[str, ...]
    columns: tuple[str, ...]
    kind: str = "blanks"


Block = Words | Points | Formula | Table | Picture | Listing | Answer | Blanks


@dataclass(frozen=True)
class Section:
    """A numbered part of the sheet; ``apart``: it begins on a page of its own in print."""

    title: str
    blocks: tuple[Block, ...]
    apart: bool = False


@dataclass(frozen=True)
class Sheet:
    """A whole sheet.

    ``facts`` are (label, text) of the head: file, date, program.
    """

    title: str
    facts: tuple[tuple[str, str], ...]
    sections: tuple[Section, ...] = field(default_factory=tuple)
