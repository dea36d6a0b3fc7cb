"""A bar over the cases of a sweep, with their rate and the time that remains."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any


class Rows:
    """Told how many further cases are finished; nothing to see where nobody watches."""

    def __call__(self, cases: int) -> None:
        """``cases`` more are finished; 0 where only time has passed."""


class TerminalRows(Rows):
    """The same on a terminal."""

    def __init__(self, progress: Any, task: Any):
        self.progress, self.task = progress, task

    def __call__(self, cases: int) -> None:
        """Moves the bar; it is drawn from here, since a thread of its own would not survive forking."""
        self.progress.update(self.task, advance=cases)
        self.progress.refresh()


@contextmanager
def counting(what: str) -> Iterator[Callable[[int], None]]:
    """Shows a count that grows, where someone watches standard error; it is gone afterwards."""
    if not sys.stderr.isatty():
        yield lambda count: None
        return
    try:
        yield lambda count: print(f"\r{what} {count}", end="", file=sys.stderr, flush=True)
    finally:
        print("\r\033[K", end="", file=sys.stderr, flush=True)


@contextmanager
def rows_progress(total: int, done: int, quiet: bool) -> Iterator[Rows]:
    """A bar over ``total`` cases, ``done`` of which were finished before, where someone watches standard error."""
    if quiet or not sys.stderr.isatty():
        yield Rows()
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, ProgressColumn, TextColumn, TimeRemainingColumn
    from rich.text import Text

    class Rate(ProgressColumn):
        """Cases in a second."""

        def render(self, task: Any) -> Text:
            return Text("" if not task.speed else f"{task.speed:,.3g} cases/s")

    ends = (TimeRemainingColumn(), TextColumn("left"))
    progress = Progress(
        TextColumn("cases"), BarColumn(), MofNCompleteColumn(), Rate(), *ends,
        console=Console(stderr=True), transient=True, auto_refresh=False, redirect_stdout=False,
        redirect_stderr=False, speed_estimate_period=60.0,
    )  # fmt: skip
    with progress:
        yield TerminalRows(progress, progress.add_task("", total=total, completed=done))
