"""The three ways ``transient run`` reports a case: in words, as JSON, or not at all."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from transient.cli.progress import Bar
from transient.cli.words import note, say

if TYPE_CHECKING:
    from transient.result.result import Result


class Printer:
    """Reports on cases beside a progress bar; ``outcome`` is "refused" or "failed"."""

    def __init__(self, bar: Bar):
        self.bar = bar

    def begun(self, case: str) -> None:
        """A case is under way."""
        self.bar.begin(case)

    def solved(self, result: Result, path: Path) -> None:
        """A case was solved and written to ``path``."""
        self.bar.end()

    def wrote(self, path: Path) -> None:
        """Another file was written beside the result."""
        with self.bar.aside():
            note(f"wrote {path}")

    def stopped(self, case: str, outcome: str, message: str) -> None:
        """A case was not solved: the message goes to standard error."""
        self.bar.end()
        with self.bar.aside():
            note(message)


class Quiet(Printer):
    """Errors only."""

    def wrote(self, path: Path) -> None:
        pass


class Json(Printer):
    """One JSON object per case on standard output."""

    def solved(self, result: Result, path: Path) -> None:
        from transient.result.store import to_json

        super().solved(result, path)
        self._print(to_json(result.summary))

    def stopped(self, case: str, outcome: str, message: str) -> None:
        super().stopped(case, outcome, message)
        self._print(json.dumps({"case": case, outcome: message}, ensure_ascii=False))

    def _print(self, line: str) -> None:
        with self.bar.aside():
            say(line if _encodable(line) else json.dumps(json.loads(line)))


def _encodable(line: str) -> bool:
    """Whether standard output can carry the line as it is; else JSON's own escapes keep it lossless."""
    try:
        line.encode(sys.stdout.encoding or "utf-8")
    except UnicodeEncodeError:
        return False
    return True


class Words(Printer):
    """The summary for people."""

    def __init__(self, bar: Bar):
        super().__init__(bar)
        self.printed = False

    def solved(self, result: Result, path: Path) -> None:
        from transient.cli.summary import describe

        super().solved(result, path)
        with self.bar.aside():
            if self.printed:
                say("")
            say(describe(result, path))
        self.printed = True
