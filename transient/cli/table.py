"""``transient table``: a result's histories, or a sweep's rows, as CSV."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated

import typer

from transient.cli.words import GOOD, Version, note, refusals


def table(
    result: Annotated[Path, typer.Argument(metavar="RESULT.h5", help="A result file.")],
    out: Annotated[
        Path | None, typer.Option("--out", metavar="FILE.csv", help="Write here instead of standard output.")
    ] = None,
    version: Version = False,
) -> int:
    """Write all histories of a result, or all rows of many cases, as CSV.

    One line per stored time, or per case, in SI and to full precision.
    """
    from transient.result.table import write_csv
    from transient.sweep.table import read

    with refusals():
        finished = read(result)
        write_csv(finished, sys.stdout if out is None else out)
    if out is not None:
        note(f"wrote {out}")
    return GOOD
