"""Columns and wrapped lines of what is printed; how numbers are said is the results' own affair."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator

from transient.result.said import listed, percent, plain, stated

__all__ = ["columns", "entry", "listed", "percent", "plain", "stated"]

WIDTH = 80
LABEL = 11


def columns(rows: list[list[str]], gap: int = 3) -> Iterator[str]:
    """Rows of cells as lines, each column as wide as its widest cell."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    for row in rows:
        yield (" " * gap).join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip()


def entry(label: str, text: str) -> list[str]:
    """A label and its text as lines of at most WIDTH columns, the text indented by LABEL."""
    return textwrap.wrap(
        text, WIDTH, initial_indent=label.ljust(LABEL), subsequent_indent=" " * LABEL,
        break_long_words=False, break_on_hyphens=False,
    )  # fmt: skip
