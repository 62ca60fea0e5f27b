"""Where each key of a TOML file stands.

The standard library's parser tells no positions, so the text is walked a second time for
keys alone: it has been parsed by then and is known to be well-formed.
"""

from __future__ import annotations

import re
import tomllib
from bisect import bisect_right
from collections.abc import Mapping

__all__ = ["KeyPath", "key_lines", "line_of"]

KeyPath = tuple[str | int, ...]

_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_BARE_VALUE = re.compile(r"[^,\]}#\n]*")
_STRINGS = (
    # A multi-line string may end in up to two quotes of its own before the closing three.
    ('"""', re.compile(r'"""(?:\\.|(?!""")[\s\S])*"{3,5}', re.DOTALL)),
    ("'''", re.compile(r"'''(?:(?!''')[\s\S])*'{3,5}")),
    ('"', re.compile(r'"(?:\\.|[^"\\\n])*"')),
    ("'", re.compile(r"'[^'\n]*'")),
)


def key_lines(text: str) -> dict[KeyPath, int]:
    """Find the line of every key and table of a well-formed TOML text.

    Parameters
    ----------
    text : str
        The text, already known to parse.

    Returns
    -------
    dict of tuple to int
        Path of keys and list positions, as ``("service", 0, "rating_a")`` → 1-based line.
        A table that only its members imply stands where the first of them does.
    """
    walk = _Walk(text)
    walk.document()
    return walk.lines


def line_of(lines: Mapping[KeyPath, int], path: KeyPath) -> int:
    """Find the line of a key, or of the nearest table around it that is written.

    Parameters
    ----------
    lines : mapping
        What `key_lines` returned.
    path : tuple of str or int
        The key.

    Returns
    -------
    int
        1-based line; 1 where nothing around the key is written.
    """
    for length in range(len(path), 0, -1):
        if path[:length] in lines:
            return lines[path[:length]]
    return 1


class _Walk:
    """A position in the text, moving forward over keys and values."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.at = 0
        self.lines: dict[KeyPath, int] = {}
        self._starts = [0, *(found.end() for found in re.finditer("\n", text))]
        self._entries: dict[KeyPath, int] = {}

    def document(self) -> None:
        table: KeyPath = ()
        self._skip(_BLANK)
        while self.at < len(self.text):
            if self.text.startswith("[", self.at):
                table = self._header()
            else:
                self._pair(table)
            self._skip(_BLANK)

    def _header(self) -> KeyPath:
        line = self._line()
        is_entry = self.text.startswith("[[", self.at)
        self.at += 2 if is_entry else 1
        *around, last = self._key()
        self.at = self.text.index("]", self.at) + (2 if is_entry else 1)
        path: KeyPath = ()
        for part in around:
            path = self._newest((*path, part))
            self.lines.setdefault(path, line)
        path = (*path, last)
        self.lines.setdefault(path, line)
        if is_entry:
            self._entries[path] = self._entries.get(path, -1) + 1
            path = self._newest(path)
        self.lines.setdefault(path, line)
        return path

    def _newest(self, path: KeyPath) -> KeyPath:
        """Step into the newest entry where the path is a list of tables."""
        return (*path, self._entries[path]) if path in self._entries else path

    def _pair(self, table: KeyPath) -> None:
        line = self._line()
        path = table
        for part in self._key():
            path = (*path, part)
            self.lines.setdefault(path, line)
        self.at = self.text.index("=", self.at) + 1
        self._skip(_BLANK)
        self._value(path)

    def _key(self) -> list[str]:
        parts = []
        while True:
            self._skip(_BLANK)
            parts.append(self._key_part())
            self._skip(_BLANK)
            if not self.text.startswith(".", self.at):
                return parts
            self.at += 1

    def _key_part(self) -> str:
        start = self.at
        if self.text[start] in "\"'":
            self._string()
            return str(tomllib.loads(f"key = {self.text[start : self.at]}")["key"])
        self._skip(_BARE_KEY)
        return self.text[start : self.at]

    def _value(self, path: KeyPath) -> None:
        first = self.text[self.at]
        if first in "\"'":
            self._string()
        elif first == "[":
            self._list(path)
        elif first == "{":
            self._inline_table(path)
        else:
            self._skip(_BARE_VALUE)

    def _list(self, path: KeyPath) -> None:
        self.at += 1
        position = 0
        while not self._closed("]"):
            self.lines.setdefault((*path, position), self._line())
            self._value((*path, position))
            position += 1

    def _inline_table(self, path: KeyPath) -> None:
        self.at += 1
        while not self._closed("}"):
            self._pair(path)

    def _closed(self, bracket: str) -> bool:
        """Step over blanks and one comma; True once the closing bracket is passed."""
        self._skip(_BLANK)
        if self.text.startswith(",", self.at):
            self.at += 1
            self._skip(_BLANK)
        if self.text.startswith(bracket, self.at):
            self.at += 1
            return True
        return False

    def _string(self) -> None:
        for quote, pattern in _STRINGS:
            if self.text.startswith(quote, self.at):
                self._skip(pattern)
                return

    def _skip(self, pattern: re.Pattern[str]) -> None:
        found = pattern.match(self.text, self.at)
        if found is not None:
            self.at = found.end()

    def _line(self) -> int:
        return bisect_right(self._starts, self.at)
