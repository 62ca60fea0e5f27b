"""The errors that stop a command.

What is wrong with the *readings* is never an exception: it is a reject, a flag or a
finding, collected and shown. An exception here means "cannot go on", and names the
file, the line, the key and what to do next.

    MeterlensError
    ├── SettingsError     site.toml or a file it names cannot be used
    ├── ExportError       a meter's export cannot be read at all
    ├── RequestError      the request does not fit the site (unknown service, month …)
    └── StoreError        the store cannot be opened or written
        └── StoreLocked   another process holds it
"""

from __future__ import annotations

from pathlib import Path

__all__ = [
    "ExportError",
    "MeterlensError",
    "RequestError",
    "SettingsError",
    "StoreError",
    "StoreLocked",
]


class MeterlensError(Exception):
    """Base of every error that ends a command with exit code 1.

    Parameters
    ----------
    message : str
        What is wrong, as one sentence.
    file : Path or str, optional
        The file at fault.
    line : int, optional
        Its 1-based line.
    key : str, optional
        The settings key or the column at fault.
    hint : str, optional
        What to do next.
    """

    def __init__(
        self,
        message: str,
        *,
        file: Path | str | None = None,
        line: int | None = None,
        key: str | None = None,
        hint: str | None = None,
    ) -> None:
        super().__init__(message)
        self.message = message
        self.file = None if file is None else str(file)
        self.line = line
        self.key = key
        self.hint = hint

    def __str__(self) -> str:
        place = "" if self.file is None else self.file
        if self.line is not None:
            place += f":{self.line}" if place else f"line {self.line}"
        parts = [f"{place}: " if place else ""]
        if self.key is not None:
            parts.append(f"{self.key}: ")
        ended = self.message.endswith((".", "!", "?"))
        parts.append(self.message if ended or not self.hint else f"{self.message}.")
        if self.hint:
            parts.append(f" {self.hint}")
        return "".join(parts)


class SettingsError(MeterlensError):
    """A settings file cannot be used: syntax, unknown key, impossible value."""


class ExportError(MeterlensError):
    """An export cannot be read: empty, binary, no such column, no readable time."""


class RequestError(MeterlensError):
    """The request does not fit the site: no such service, no such month."""


class StoreError(MeterlensError):
    """The store cannot be opened, read or written."""


class StoreLocked(StoreError):  # noqa: N818
    """Another process holds the store for writing."""
