"""A sheet on disk, as the file's ending says."""

from __future__ import annotations

import os
from pathlib import Path

from transient.result.result import Result, ResultError
from transient.result.whole import whole
from transient.sheet.document.compose import compose
from transient.sheet.document.facts import Facts
from transient.sheet.document.page import html


def write_sheet(
    result: Result, path: str | os.PathLike[str], name: str = "", factor: float | None = None, note: str = ""
) -> None:
    """Writes the sheet of ``result``, whole or not at all: an HTML page, or a PDF where ``path`` ends in .pdf.

    ``name`` of the result's file; ``factor`` on loads, shown apart; ``note`` words of the user's own.
    Raises ResultError for another ending, where the result holds no run, or where the file cannot be written.
    """
    ending = Path(path).suffix.lower()
    if ending not in WRITERS:
        raise ResultError(f"{path}: a sheet ends in .html or .pdf")
    facts = Facts(result, name or f"{Path(path).stem}.h5", factor, note)
    with whole(path) as draft:
        WRITERS[ending](facts, Path(draft))


def _page(facts: Facts, path: Path) -> None:
    path.write_text(html(facts), encoding="utf-8")


def _paper(facts: Facts, path: Path) -> None:
    from transient.sheet.document.paper import write_pdf

    write_pdf(compose(facts), path)


WRITERS = {".html": _page, ".pdf": _paper}
