"""What all commands share: how they stop, what goes to which stream, and ``--version``."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Annotated

import typer

GOOD, FAILED, REFUSED, UNREACHED, INTERRUPTED = 0, 1, 2, 3, 130

_SPELLINGS = {"±": "+-", "µ": "u", "²": "^2", "³": "^3", "·": " "}


class Stop(Exception):
    """Ends a command with one line on standard error and an exit status."""

    def __init__(self, message: str, status: int = REFUSED):
        super().__init__(message)
        self.status = status


@contextmanager
def refusals() -> Iterator[None]:
    """Turn what the rooms below refuse (a case, a result file, a drawing) into ``Stop`` with status 2."""
    from transient.case.read import CaseError
    from transient.result.result import ResultError

    try:
        yield
    except (CaseError, ResultError) as error:
        raise Stop(str(error)) from None


def note(text: str) -> None:
    """One line on standard error."""
    print(_spelled(text, sys.stderr.encoding or "utf-8"), file=sys.stderr, flush=True)


def say(text: str) -> None:
    """Lines on standard output; signs that its encoding lacks are spelled out."""
    print(_spelled(text, sys.stdout.encoding or "utf-8"), flush=True)


def _spelled(text: str, encoding: str) -> str:
    for sign, spelling in _SPELLINGS.items():
        try:
            sign.encode(encoding)
        except UnicodeEncodeError:
            text = text.replace(sign, spelling)
    return text.encode(encoding, errors="replace").decode(encoding)


def one_line(text: str) -> str:
    """A message without line breaks and runs of blanks."""
    return " ".join(text.split())


def own_error(error: Exception) -> str:
    """What is said about an error that is the program's own fault; with TRANSIENT_DEBUG set it is raised instead."""
    if os.environ.get("TRANSIENT_DEBUG"):
        raise error
    return one_line(
        f"transient met an error of its own ({type(error).__name__}: {error}); please report it together with the "
        "case file (TRANSIENT_DEBUG=1 shows where it happened)"
    )


def program() -> str:
    """Name and version of the installed program."""
    from importlib.metadata import version as installed

    return f"transient {installed('transient')}"


def _show_version(wanted: bool) -> None:
    if wanted:
        say(program())
        raise typer.Exit()


Version = Annotated[
    bool, typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version and stop.")
]
Overrides = Annotated[
    list[str] | None,
    typer.Option("--set", metavar="KEY=VALUE", help='Override a key, as in --set gap.height="0.5 mm"; repeatable.'),
]


def changes(overrides: list[str] | None) -> list[tuple[str, str]]:
    """``--set`` texts as (key, value text).  Raises Stop where one has no key or no equals sign."""
    return [_change(text) for text in overrides or []]


def _change(text: str) -> tuple[str, str]:
    key, equals, value = text.partition("=")
    if not equals or not key.strip():
        raise Stop(f'--set {text}: a key and a value are needed, such as --set gap.height="0.5 mm"')
    return key.strip(), value
