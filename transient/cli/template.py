"""``transient template``: a commented case file to start from."""

from __future__ import annotations

from typing import Annotated

import typer

from transient.cli.words import GOOD, Version, refusals, say


def template(
    shape: Annotated[str, typer.Argument(metavar="SHAPE", help="plates, pipe or annulus")],
    version: Version = False,
) -> int:
    """Print a commented case file to start from."""
    from transient.case.template import template as text

    with refusals():
        say(text(shape).rstrip("\n"))
    return GOOD
