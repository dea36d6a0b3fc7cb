"""``transient sheet``: the calculation sheet of a finished result."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Annotated

import typer

from transient.cli.words import GOOD, Stop, Version, note, refusals

FORMS = (".html", ".pdf")


def sheet(
    result: Annotated[Path, typer.Argument(metavar="RESULT.h5", help="A result file.")],
    out: Annotated[
        Path | None, typer.Option("--out", metavar="FILE", help="Write here: HTML or PDF; else beside the result.")
    ] = None,
    pdf: Annotated[bool, typer.Option("--pdf", help="Write a PDF instead of a page.")] = False,
    factor: Annotated[
        str | None, typer.Option("--factor", metavar="NUMBER", help="Show the loads times this as well, apart.")
    ] = None,
    words: Annotated[
        str, typer.Option("--note", metavar="TEXT", help="A purpose or remark of your own, put at the top.")
    ] = "",
    sweep: Annotated[
        Path | None,
        typer.Option("--sweep", metavar="SWEEP.h5", help="The same case over its tolerances: the input uncertainty."),
    ] = None,
    version: Version = False,
) -> int:
    """Write a result up for a design file, as one page that needs no network.

    The calculation sheet: inputs as typed and in SI, equations, assumptions and checks, the answer with its errors,
    hand formulas, figures, cautions, and the case in full.
    """
    target = _target(result, out, pdf)
    scale = _factor(factor)
    from transient.result.store import read
    from transient.sheet.document.write import write_sheet

    with refusals():
        varied = None if sweep is None else read(sweep)
        write_sheet(read(result), target, result.name, scale, words, varied, str(sweep))
    note(f"wrote {target}")
    return GOOD


def _target(result: Path, out: Path | None, pdf: bool) -> Path:
    """The file to write.  Raises Stop where its ending is of no use, or where it is the result itself."""
    ending = ".pdf" if pdf else ".html"
    target = result.with_suffix(ending) if out is None else out
    if target.suffix.lower() not in FORMS or (pdf and target.suffix.lower() != ".pdf"):
        raise Stop(f"--out {out}: a sheet ends in {ending}, such as {target.with_suffix(ending).name}")
    return target


def _factor(text: str | None) -> float | None:
    if text is None:
        return None
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not 0.0 < value < math.inf:
        raise Stop(f"--factor {text}: a number above zero without unit is needed, such as 1.5")
    return value
