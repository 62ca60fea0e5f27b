"""An export's text: its encoding, its line ends, its quotes, and its first lines.

The reader proper takes whole lines of UTF-8 with one kind of line end and no quotes.
Exports that are otherwise are rewritten once into a temporary file; line numbers stay
those of the file as it is.
"""

from __future__ import annotations

import codecs
import io
import os
import shutil
import stat
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np

from meterlens.errors import ExportError
from meterlens.store.byte_scan import (
    LINE_SEPARATOR,
    ByteScan,
    find_encoding,
    mark_encoding,
    scan,
)
from meterlens.store.quotes import quoted_records, usual_field_count
from meterlens.store.zones import IntArray

__all__ = ["FIELD_SEPARATOR", "ExportText", "opened_export"]

FIELD_SEPARATOR = "\x1f"
_CHUNK = 1 << 20
_HEAD_BYTES = 1 << 17
#: Where lines are long, more of them is read until there are so many, but not without end.
_HEAD_LINES = 40
_HEAD_BYTES_AT_MOST = 1 << 22
_SAMPLE_LINES = 500
#: The database would take a path with one of these for a pattern.
_PATTERN_CHARACTERS = frozenset("*?[]{}")


@dataclass
class ExportText:
    """An export ready for the line reader.

    Attributes
    ----------
    file : Path
        The export itself, for messages.
    lines_path : Path
        What the line reader reads: the export, a link to it, or its rewritten form.
    size_bytes : int
    sha256 : str
        Of the export's own bytes.
    encoding : str
        As found or as given.
    has_quotes, has_underscore : bool
        Whether such a character stands anywhere in it.
    head : list of str
        The first lines, as they are.
    notes : list of str
        What was found out about its text.
    delimiter : str or None
        Set to `FIELD_SEPARATOR` once quotes were taken out.
    line_numbers : IntArray or None
        Line number of each record where records span lines.
    """

    file: Path
    lines_path: Path
    size_bytes: int
    sha256: str
    encoding: str
    has_quotes: bool
    has_underscore: bool
    head: list[str]
    folder: Path = field(repr=False)
    notes: list[str] = field(default_factory=list)
    delimiter: str | None = None
    line_numbers: IntArray | None = None

    def head_records(self, delimiter: str) -> list[tuple[int, list[str]]]:
        """1-based line and fields of the first records, split at a delimiter."""
        if not self.has_quotes:
            return [(n, line.split(delimiter)) for n, line in enumerate(self.head, 1)]
        lines = (line + "\n" for line in self.head)
        return list(quoted_records(lines, delimiter, self._usual_field_count(delimiter)))

    def without_quotes(self, delimiter: str) -> None:
        """Rewrite a quoted export with unquoted fields, one record a line."""
        if not self.has_quotes:
            self.delimiter = delimiter
            return
        target = self.folder / "unquoted.txt"
        usual = self._usual_field_count(delimiter)
        numbers: list[int] = []
        with (
            self.lines_path.open(encoding="utf-8-sig", newline=None) as source,
            target.open("w", encoding="utf-8", newline="\n") as sink,
        ):
            for number, record in quoted_records(source, delimiter, usual):
                numbers.append(number)
                sink.write(FIELD_SEPARATOR.join(record).replace("\n", " ") + "\n")
        self.lines_path = target
        self.delimiter = FIELD_SEPARATOR
        self.line_numbers = np.array(numbers, dtype=np.int64)

    def _usual_field_count(self, delimiter: str) -> int:
        return usual_field_count(self.head[:_SAMPLE_LINES], delimiter)


@contextmanager
def opened_export(file: Path, encoding: str | None) -> Iterator[ExportText]:
    """An export's text, with whatever temporary file it needs.

    Parameters
    ----------
    file : Path
        The export.
    encoding : str or None
        As the map says; None to find out (byte order mark, else UTF-8, else cp1252).

    Raises
    ------
    ExportError
        Not there, no regular file, empty, binary, or not in the encoding that the map names.
    """
    try:
        status = file.stat()
        _check_kind(file, status.st_mode)
        with file.open("rb") as source:
            head = source.read(_HEAD_BYTES)
    except FileNotFoundError:
        raise ExportError("no such file", file=file) from None
    except OSError as error:
        raise ExportError(f"cannot be read ({error.strerror})", file=file) from None
    if not head.strip():
        raise ExportError("is empty", file=file, hint="Export it from the meter again.")
    marked = mark_encoding(head)
    if b"\0" in head and not _is_wide(encoding or marked or "utf-8"):
        raise ExportError(
            "is binary, not text",
            file=file,
            hint="Export the readings as CSV text; name the encoding where that is UTF-16.",
        )
    with TemporaryDirectory(prefix="meterlens-") as name:
        yield _inspect(file, status.st_size, (encoding, marked), Path(name))


def _check_kind(file: Path, mode: int) -> None:
    """Refuse what is no file of bytes, before anything waits for a pipe."""
    if stat.S_ISDIR(mode):
        raise ExportError("is a folder, not an export", file=file)
    if not stat.S_ISREG(mode):
        raise ExportError(
            "is no regular file", file=file, hint="Save the export into a file first."
        )


def _is_wide(encoding: str) -> bool:
    """True for encodings whose plain letters have bytes of zero."""
    return codecs.lookup(encoding).name.startswith(("utf-16", "utf-32"))


def _inspect(
    file: Path, size: int, encodings: tuple[str | None, str | None], folder: Path
) -> ExportText:
    """Read the bytes once; rewrite the export where the line reader could not take it."""
    named, marked = encodings
    scanned = scan(file)
    chosen, note = named or marked, None
    if chosen is None:
        chosen, note = find_encoding(file, scanned)
    elif named is None and chosen != "utf-8-sig":
        note = f"read as {chosen}"
    elif named is None and not scanned.is_utf8:
        note = "read as UTF-8, although some bytes of it cannot be: shown as \ufffd"
    lines_path = _lines_path(file, chosen, scanned, folder, strict=named is not None)
    if file.stat().st_size != size:
        raise ExportError(
            "changed while it was being read", file=file, hint="Ingest it again when it is whole."
        )
    return ExportText(
        file=file,
        lines_path=lines_path,
        size_bytes=size,
        sha256=scanned.sha256,
        encoding=chosen,
        has_quotes=scanned.has_quotes,
        has_underscore=scanned.has_underscore,
        head=_head_lines(file, lines_path),
        folder=folder,
        notes=[] if note is None else [note],
    )


def _lines_path(
    file: Path, encoding: str, scanned: ByteScan, folder: Path, *, strict: bool
) -> Path:
    """The export itself where the line reader can take it; else a link or a rewritten form."""
    is_plain = codecs.lookup(encoding).name in ("utf-8", "utf-8-sig", "ascii") and scanned.is_utf8
    if not is_plain or scanned.has_mixed_ends or scanned.has_separator:
        return _rewritten(file, encoding, folder / "lines.txt", strict=strict)
    place = file.absolute()
    return _linked(place, folder / "link") if _PATTERN_CHARACTERS & set(str(place)) else place


def _linked(file: Path, target: Path) -> Path:
    """Another name for a file; a copy where the disk knows no links."""
    for link in (os.symlink, os.link):
        try:
            link(file, target)
        except (OSError, NotImplementedError):
            continue
        return target
    shutil.copyfile(file, target)
    return target


def _rewritten(file: Path, encoding: str, target: Path, *, strict: bool) -> Path:
    """UTF-8 with plain line ends. A found encoding lets broken bytes pay for themselves."""
    errors = "strict" if strict else "replace"
    try:
        with (
            file.open(encoding=encoding, errors=errors, newline=None) as source,
            target.open("w", encoding="utf-8", newline="\n") as sink,
        ):
            first = source.read(1)
            sink.write(first.removeprefix("\ufeff").replace(LINE_SEPARATOR, " "))
            while chunk := source.read(_CHUNK):
                sink.write(chunk.replace(LINE_SEPARATOR, " "))
    except UnicodeError as error:
        raise ExportError(
            f"is not {encoding} text ({error})",
            file=file,
            key="encoding",
            hint="Name its encoding in the column map, or leave the key out.",
        ) from None
    return target


def _head_lines(file: Path, path: Path) -> list[str]:
    """The first lines: of a usual export some hundreds, of one with long lines fewer."""
    limit = _HEAD_BYTES
    with path.open("rb") as source:
        head = source.read(limit)
        while len(head) == limit < _HEAD_BYTES_AT_MOST and len(head.splitlines()) <= _HEAD_LINES:
            head += source.read(limit)
            limit *= 2
    whole = len(head) < limit
    text = head.decode("utf-8", errors="ignore").removeprefix("\ufeff")
    lines = io.StringIO(text, newline=None).read().split("\n")
    if not whole and len(lines) == 1:
        raise ExportError(
            f"its first line is longer than {_HEAD_BYTES_AT_MOST >> 20} MiB",
            file=file,
            line=1,
            hint="Export the readings as CSV text, one interval a line.",
        )
    return lines if whole else lines[:-1]
