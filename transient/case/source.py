"""Where a case comes from, and how every refusal about it is worded: one line with file, line and key."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from difflib import get_close_matches
from functools import cached_property
from pathlib import Path as FilePath
from typing import Any

from transient.case.lines import Path, find_lines
from transient.units import QuantityError, typed


class CaseError(ValueError):
    """A case that is refused; the message is one line for the user."""

    def __init__(self, message: str, key: str = ""):
        # Names and values come from the file: line breaks and control signs in them must not reach a terminal.
        super().__init__("".join(sign if sign.isprintable() else " " for sign in message))
        self.key = key


def dotted(path: Path) -> str:
    """A path as a user writes it, list items counted from 1."""
    return ".".join(str(part + 1) if isinstance(part, int) else part for part in path)


def nearest(name: str, known: Iterable[str]) -> str:
    """What to say after an unknown name: the nearest right one, or all of them."""
    names = list(known)
    close = get_close_matches(name, names, n=1, cutoff=0.6)
    return f'did you mean "{close[0]}"?' if close else f"known here: {', '.join(names)}"


@dataclass(frozen=True)
class Source:
    """A case's file as it was named, its folder, its text, and the keys set by an option."""

    file: str = ""
    folder: FilePath | None = None
    text: str = ""
    overridden: frozenset[Path] = frozenset()

    @cached_property
    def lines(self) -> dict[Path, int]:
        """The line of each key; worked out only when something is refused."""
        return find_lines(self.text)

    def where(self, path: Path) -> str:
        """The beginning of a message about ``path``: "file:line: key", as far as these are known."""
        key = dotted(path)
        cause = self._cause(path)
        if cause is not None:
            # Named as the option does where that is another key: a whole table that was set, or a table it brought.
            option = f"--set {dotted(cause)}"
            return ": ".join(part for part in (self.file, option, "" if cause == path else key) if part)
        line = next((self.lines[path[:end]] for end in range(len(path), 0, -1) if path[:end] in self.lines), None)
        place = f"{self.file}:{line}" if line and self.file else self.file
        return ": ".join(part for part in (place, key) if part)

    def _cause(self, path: Path) -> Path | None:
        """The key set by an option that ``path`` lies in, or that brought it about."""
        above = next((path[:end] for end in range(len(path), 0, -1) if path[:end] in self.overridden), None)
        if above is not None or path in self.lines:
            return above
        return next((one for one in sorted(self.overridden, key=str) if one[: len(path)] == path), None)

    def refuse(self, path: Path, message: str) -> CaseError:
        """A refusal about ``path``; to be raised by the caller."""
        return CaseError(f"{self.where(path)}: {message}", dotted(path))

    def fault(self, path: Path, value: Any, fault: str, need: str) -> CaseError:
        """A refusal in the common form: given, what is wrong with it, what is needed."""
        return self.refuse(path, f"{typed(value)} {fault}; {need}")

    def quantity(self, path: Path, error: QuantityError) -> CaseError:
        """A refusal of a quantity."""
        return self.refuse(path, str(error))
