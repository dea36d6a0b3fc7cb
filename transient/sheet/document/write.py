"""A sheet on disk, as the file's ending says."""

from __future__ import annotations

import os
from pathlib import Path

from transient.result.result import Result, ResultError
from transient.result.whole import whole
from transient.sheet.document.compose import compose
from transient.sheet.document.facts import Facts
from transient.sheet.document.page import html
from transient.sheet.stated import case_of


def write_sheet(
    result: Result,
    path: str | os.PathLike[str],
    name: str = "",
    factor: float | None = None,
    note: str = "",
    sweep: Result | None = None,
    sweep_name: str = "the sweep",
) -> None:
    """Writes the sheet of ``result``, whole or not at all: an HTML page, or a PDF where ``path`` ends in .pdf.

    ``name`` of the result's file; ``factor`` on loads, shown apart; ``note`` words of the user's own; ``sweep`` of the
    same case over its tolerances, which states the input uncertainty.
    Raises ResultError for another ending, where the sweep is of another case, or where the file cannot be written.
    """
    ending = Path(path).suffix.lower()
    if ending not in WRITERS:
        raise ResultError(f"{path}: a sheet ends in .html or .pdf")
    if sweep is not None:
        _refuse_another(result, sweep, sweep_name)
    facts = Facts(result, name or f"{Path(path).stem}.h5", factor, note, sweep, Path(sweep_name).name)
    with whole(path) as draft:
        WRITERS[ending](facts, Path(draft))


def _refuse_another(result: Result, sweep: Result, name: str) -> None:
    """Raises ResultError where ``sweep`` does not vary the result's own case."""
    if "case" not in sweep.variables:
        raise ResultError(f"{name}: holds a single run; the result of a sweep is needed")
    if "case" in result.variables:
        raise ResultError(f"{name}: goes with the sheet of a single run, and this one is that of a sweep")
    if sweep.case_text != result.case_text and case_of(sweep) != case_of(result):
        raise ResultError(f"{name}: varies another case than this result's")


def _page(facts: Facts, path: Path) -> None:
    path.write_text(html(facts), encoding="utf-8")


def _paper(facts: Facts, path: Path) -> None:
    from transient.sheet.document.paper import write_pdf

    write_pdf(compose(facts), path)


WRITERS = {".html": _page, ".pdf": _paper}
