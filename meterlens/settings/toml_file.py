"""A TOML file with the lines of its keys, read with errors that say where."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from meterlens.errors import SettingsError
from meterlens.settings.key_lines import KeyPath, key_lines, line_of

__all__ = ["TomlFile", "read_toml"]

_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)$")


@dataclass(frozen=True)
class TomlFile:
    """What a TOML file holds, and the 1-based line of each of its keys."""

    path: Path
    tables: dict[str, Any]
    lines: dict[KeyPath, int]

    def line(self, key: KeyPath) -> int:
        """Find the 1-based line of a key, or of the nearest table around it."""
        return line_of(self.lines, key)


def read_toml(path: Path) -> TomlFile:
    """Read a TOML file.

    Parameters
    ----------
    path : Path
        The file. It is UTF-8, with or without a byte order mark.

    Returns
    -------
    TomlFile

    Raises
    ------
    SettingsError
        Where the file cannot be read, is not UTF-8 or is no TOML; with the line.
    """
    try:
        raw = path.read_bytes()
    except OSError as error:
        raise SettingsError(f"cannot be read: {error.strerror}.", file=path) from error
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        # With the mark stripped first, the position counts from behind it; no line is lost.
        raise SettingsError(
            "is not UTF-8 text.",
            file=path,
            line=raw.count(b"\n", 0, error.start) + 1,
            hint="Save it as UTF-8.",
        ) from error
    text = text.replace("\r\n", "\n")
    try:
        tables = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise _syntax_error(path, text, str(error)) from error
    return TomlFile(path, tables, key_lines(text))


def _syntax_error(path: Path, text: str, message: str) -> SettingsError:
    found = _PLACE.search(message)
    line, hint = None, None
    if found is not None:
        message = message[: found.start()]
        line = int(found[1]) if found[1] else len(text.rstrip().splitlines()) or 1
        hint = f"At column {found[2]}." if found[2] else "At the end of the file."
    return SettingsError(f"is no valid TOML: {message}.", file=path, line=line, hint=hint)
