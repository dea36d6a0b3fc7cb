"""``transient check``: what a case file says, read but not solved."""

from __future__ import annotations

from typing import Annotated

import typer

from transient.cli.words import GOOD, Overrides, Version, changes, refusals, say


def check(
    case: Annotated[str, typer.Argument(metavar="CASE.toml", help="The case file to read.")],
    overrides: Overrides = None,
    version: Version = False,
) -> int:
    """Read a case file without solving it.

    Prints the inputs as typed and in SI, derived numbers such as the diffusion time, and cautions.
    """
    from transient.case.derived import derived, horizon
    from transient.case.read import read_case
    from transient.cli import echo
    from transient.trust.preview import preview

    with refusals():
        read = read_case(case, changes(overrides))
    problem = read.problem()
    blocks = (
        [read.title],
        echo.inputs(read.inputs()),
        echo.derived(derived(read)),
        echo.cautions(preview(problem, horizon(problem))),
    )
    say("\n\n".join("\n".join(block) for block in blocks))
    return GOOD
