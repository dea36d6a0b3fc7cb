"""``transient figure``: pictures of a finished result."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from transient.cli.numbers import listed
from transient.cli.words import GOOD, Stop, Version, note, refusals


def figure(
    result: Annotated[Path, typer.Argument(metavar="RESULT.h5", help="A result file.")],
    name: Annotated[str | None, typer.Argument(metavar="NAME", help="Which figure; else the overview.")] = None,
    out: Annotated[Path | None, typer.Option("--out", metavar="FILE", help="Write here: PNG, SVG or PDF.")] = None,
    version: Version = False,
) -> int:
    """Draw a result as PNG, SVG or PDF.

    Without a name: an overview of wall stress, drive, flow and profiles.  Written beside the result unless --out says
    otherwise.
    """
    from transient.result.store import read
    from transient.sheet.figures import DEFAULT, FIGURES, FORMATS, draw, save

    if name is not None and name not in FIGURES:
        raise Stop(f'there is no figure "{name}"; there are {listed(list(FIGURES))}')
    if out is not None and out.suffix.lower().removeprefix(".") not in FORMATS:
        raise Stop(f"--out {out}: a figure ends in .png, .svg or .pdf, such as {out.with_suffix('.png').name}")
    with refusals():
        chosen = name or DEFAULT
        target = out or result.with_name(f"{result.stem}_{chosen}.png")
        save(draw(read(result), chosen), target)
    note(f"wrote {target}")
    return GOOD
