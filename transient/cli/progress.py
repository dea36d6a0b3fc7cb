"""What the user sees while waiting: a bar over the cases, and a word about the first run."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

from transient.cli.words import note

_SAID: list[bool] = []  # said once, it need not be said again in this process
_PENDING: list[bool] = []  # and one listener is enough


class Bar:
    """Nothing to see: one case, no terminal, or --quiet."""

    def begin(self, label: str) -> None:
        """Name the case under way."""

    def end(self) -> None:
        """Count a case as done."""

    @contextmanager
    def aside(self) -> Iterator[None]:
        """Keep the terminal's last line free while something is printed."""
        yield


class TerminalBar(Bar):
    """A bar on standard error that steps aside for what is printed."""

    def __init__(self, bar: Any, task: Any):
        self.bar = bar
        self.task = task

    def begin(self, label: str) -> None:
        self.bar.update(self.task, description=label)

    def end(self) -> None:
        self.bar.advance(self.task)

    @contextmanager
    def aside(self) -> Iterator[None]:
        self.bar.stop()
        try:
            yield
        finally:
            self.bar.start()


@contextmanager
def progress(total: int, quiet: bool) -> Iterator[Bar]:
    """A bar over ``total`` cases where there are several and someone is watching standard error."""
    if quiet or total < 2 or not sys.stderr.isatty():
        yield Bar()
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeElapsedColumn

    columns = (TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn(), TimeElapsedColumn())
    bar = Progress(
        *columns, console=Console(stderr=True), transient=True, redirect_stdout=False, redirect_stderr=False
    )
    with bar:
        yield TerminalBar(bar, bar.add_task("", total=total))


def announce_compiling(bar: Bar) -> None:
    """From now on say, once, why a run takes longer, at the moment when the compiler sets to work."""
    from numba.core import event

    if _SAID or _PENDING:
        return
    _PENDING.append(True)

    class Announcement(event.Listener):
        """Heard when nothing usable is in the compiler's cache: first run, new version, or no place for a cache."""

        def on_start(self, event_: event.Event) -> None:
            event.unregister("numba:compile", self)
            _PENDING.clear()
            _SAID.append(True)
            with bar.aside():
                note("first run: preparing the compiled solver, once, about 15 s")

        def on_end(self, event_: event.Event) -> None:
            """Nothing to say."""

    event.register("numba:compile", Announcement())
