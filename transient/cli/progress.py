"""What the user sees while waiting: a bar over the cases, and a word about the first run."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from transient.cli.words import note


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


def announce_first_run() -> None:
    """Say why the first call after installation takes longer."""
    from transient.march import kernel

    if _compiled_before(kernel.march.stats.cache_path, Path(kernel.__file__)):
        return
    note("first run: preparing the compiled solver, once, about 15 s")


def _compiled_before(folder: str | None, source: Path) -> bool:
    """Whether the compiler's cache holds a kernel that is not older than its source."""
    if folder is None:
        return False
    python = f"py{sys.version_info.major}{sys.version_info.minor}"
    indexes = Path(folder).glob(f"{source.stem}.*{python}.nbi")
    return any(index.stat().st_mtime >= source.stat().st_mtime for index in indexes)
