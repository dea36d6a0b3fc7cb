"""On which line each key of a TOML text stands.  The text is known to be valid: this only finds places."""

from __future__ import annotations

import tomllib

Path = tuple[str | int, ...]


def find_lines(text: str) -> dict[Path, int]:
    """Line number (from 1) of every table, key and list item, by its path in the parsed tree (items from 0)."""
    return _Scanner(text).run()


def _plain(quoted: str) -> str:
    """The name that a quoted key stands for."""
    return quoted[1:-1] if quoted[0] == "'" or "\\" not in quoted else tomllib.loads(f"name = {quoted}")["name"]


class _Scanner:
    """Walks a valid TOML text once, keeping the path it is at."""

    def __init__(self, text: str):
        self.text = text.replace("\r\n", "\n")
        self.at = 0
        self.lines: dict[Path, int] = {}
        self.counts: dict[Path, int] = {}  # entries so far of each array of tables
        self.counted = (0, 1)  # the line at a place behind which nothing is counted again

    def run(self) -> dict[Path, int]:
        table: Path = ()
        while True:
            self._skip_blank()
            if self.at >= len(self.text):
                return self.lines
            if self.text[self.at] == "[":
                table = self._header()
            else:
                self._pair(table)

    def _line(self) -> int:
        place, line = self.counted
        self.counted = (self.at, line + self.text.count("\n", place, self.at))
        return self.counted[1]

    def _note(self, path: Path) -> None:
        for end in range(1, len(path) + 1):
            self.lines.setdefault(path[:end], self._line())

    def _skip_blank(self) -> None:
        """To the next sign that means something: over spaces, line ends, commas and comments."""
        while self.at < len(self.text):
            if self.text[self.at] == "#":
                end = self.text.find("\n", self.at)
                self.at = len(self.text) if end < 0 else end
            elif self.text[self.at] in " \t\n\r,\ufeff":
                self.at += 1
            else:
                return

    def _header(self) -> Path:
        double = self.text.startswith("[[", self.at)
        self.at += 2 if double else 1
        path = self._inside_arrays(self._key(), double)
        self.lines[path] = self._line()
        self._note(path)
        self.at = self.text.index("]", self.at) + (2 if double else 1)
        return path

    def _inside_arrays(self, key: Path, new: bool) -> Path:
        """The path of a header, with the number of the entry at each array of tables on the way."""
        path: Path = ()
        for position, name in enumerate(key):
            path = (*path, name)
            last = position == len(key) - 1
            if last and new:
                self.counts[path] = self.counts.get(path, 0) + 1
            if path in self.counts:
                path = (*path, self.counts[path] - 1)
        return path

    def _key(self) -> Path:
        names: list[str] = []
        while True:
            self._skip_spaces()
            sign = self.text[self.at]
            if sign in "\"'":
                names.append(_plain(self._string()))
            else:
                start = self.at
                while self.at < len(self.text) and (self.text[self.at].isalnum() or self.text[self.at] in "-_"):
                    self.at += 1
                names.append(self.text[start : self.at])
            self._skip_spaces()
            if self.text[self.at : self.at + 1] != ".":
                return tuple(names)
            self.at += 1

    def _skip_spaces(self) -> None:
        while self.text[self.at : self.at + 1] in (" ", "\t"):
            self.at += 1

    def _pair(self, table: Path) -> None:
        line = self._line()
        path = (*table, *self._key())
        for end in range(1, len(path) + 1):
            self.lines.setdefault(path[:end], line)
        self.at = self.text.index("=", self.at) + 1
        self._value(path)

    def _value(self, path: Path) -> None:
        self._skip_blank()
        self._note(path)
        sign = self.text[self.at]
        if sign in "\"'":
            self._string()
        elif sign == "[":
            self._items(path)
        elif sign == "{":
            self._pairs(path)
        else:
            while self.at < len(self.text) and self.text[self.at] not in ",]}#\n":
                self.at += 1

    def _items(self, path: Path) -> None:
        self.at += 1
        number = 0
        while True:
            self._skip_blank()
            if self.text[self.at] == "]":
                self.at += 1
                return
            self._value((*path, number))
            number += 1

    def _pairs(self, path: Path) -> None:
        self.at += 1
        while True:
            self._skip_blank()
            if self.text[self.at] == "}":
                self.at += 1
                return
            self._pair(path)

    def _string(self) -> str:
        """Over a string of any of the four forms; returns it with its (single) quotes."""
        quote = self.text[self.at]
        start = self.at
        if self.text.startswith(quote * 3, self.at):
            self.at += 3
            while not self.text.startswith(quote * 3, self.at):
                self.at += 2 if self.text[self.at] == "\\" and quote == '"' else 1
            while self.text.startswith(quote * 4, self.at):  # up to two quotes may end the content
                self.at += 1
            self.at += 3
        else:
            self.at += 1
            while self.text[self.at] != quote:
                self.at += 2 if self.text[self.at] == "\\" and quote == '"' else 1
            self.at += 1
        return self.text[start : self.at]
