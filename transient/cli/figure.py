"""``transient figure``: pictures of a finished result."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from transient.cli.numbers import listed
from transient.cli.words import GOOD, Stop, Version, note, refusals

FORMATS = (".png", ".svg", ".pdf")


def figure(
    result: Annotated[Path, typer.Argument(metavar="RESULT.h5", help="A result file.")],
    name: Annotated[
        str | None, typer.Argument(metavar="[NAME]", help="Which figure; without a name, all that the result allows.")
    ] = None,
    out: Annotated[
        Path | None,
        typer.Option("--out", metavar="FILE", help="Write here (PNG, SVG or PDF by its ending); needs a NAME."),
    ] = None,
    version: Version = False,
) -> int:
    """Draw a result as PNG, SVG or PDF.

    Wall stress and drive over time, velocity profiles, flow: by default each as a PNG beside the result.
    """
    if out is not None and out.suffix.lower() not in FORMATS:
        raise Stop(f"--out {out}: a figure ends in .png, .svg or .pdf, such as {out.with_suffix('.png').name}")
    if out is not None and name is None:
        raise Stop("--out names one file, so say which figure goes there: transient figure RESULT.h5 NAME --out FILE")
    from transient.result.store import read
    from transient.sheet.figures import FIGURES

    if name is not None and name not in FIGURES:
        raise Stop(f'there is no figure "{name}"; there are {listed(list(FIGURES))}')
    with refusals():
        finished = read(result)
        for chosen in [name] if name else list(FIGURES):
            target = out or result.with_name(f"{result.stem}_{chosen}.png")
            FIGURES[chosen].save(finished, target)
            note(f"wrote {target}")
    return GOOD
