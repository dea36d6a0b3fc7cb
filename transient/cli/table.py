"""``transient table``: a result's histories as CSV."""

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
    """Write the histories of a result as CSV.

    One line per stored time, in SI and to full precision.
    """
    from transient.result.store import read
    from transient.result.table import write_csv

    with refusals():
        finished = read(result)
        write_csv(finished, sys.stdout if out is None else out)
    if out is not None:
        note(f"wrote {out}")
    return GOOD
