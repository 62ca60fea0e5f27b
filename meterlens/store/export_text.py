"""An export's bytes: fingerprint, encoding, line ends and quotes.

The reader proper takes whole lines of UTF-8 with one kind of line end and no quotes.
Exports that are otherwise are rewritten once into a temporary file; line numbers stay
those of the file as it is.
"""

from __future__ import annotations

import codecs
import csv
import hashlib
import io
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np

from meterlens.errors import ExportError
from meterlens.store.zones import IntArray

__all__ = ["FIELD_SEPARATOR", "ExportText", "opened_export"]

FIELD_SEPARATOR = "\x1f"
_CHUNK = 1 << 20
_HEAD_BYTES = 1 << 17
_BOMS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)


@dataclass
class ExportText:
    """An export ready for the line reader.

    Attributes
    ----------
    file : Path
        The export itself, for messages.
    lines_path : Path
        What the line reader reads: the export, or its rewritten form.
    size_bytes : int
    sha256 : str
        Of the export's own bytes.
    encoding : str
        As found or as given.
    has_quotes, has_underscore : bool
        Whether such a character stands anywhere in it.
    head : list of str
        The first lines, as they are.
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
    delimiter: str | None = None
    line_numbers: IntArray | None = None
    folder: Path | None = field(default=None, repr=False)

    def without_quotes(self, delimiter: str) -> None:
        """Rewrite a quoted export with unquoted fields, one record a line."""
        if not self.has_quotes:
            self.delimiter = delimiter
            return
        assert self.folder is not None
        target = self.folder / "unquoted.txt"
        numbers: list[int] = []
        previous = 0
        with (
            self.lines_path.open(encoding="utf-8", newline="") as source,
            target.open("w", encoding="utf-8", newline="") as sink,
        ):
            reader = csv.reader(source, delimiter=delimiter)
            try:
                for record in reader:
                    numbers.append(previous + 1)
                    previous = reader.line_num
                    clean = (f.replace("\n", " ").replace("\r", " ") for f in record)
                    sink.write(FIELD_SEPARATOR.join(clean) + "\n")
            except csv.Error as error:
                raise ExportError(
                    f"a quoted field cannot be read ({error})",
                    file=self.file,
                    line=reader.line_num,
                ) from None
        self.lines_path = target
        self.delimiter = FIELD_SEPARATOR
        self.line_numbers = np.array(numbers, dtype=np.int64)


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
        Not there, a folder, empty, binary, or not in the encoding that the map names.
    """
    try:
        size = file.stat().st_size
        if file.is_dir():
            raise ExportError("is a folder, not an export", file=file)
        with file.open("rb") as source:
            head = source.read(_HEAD_BYTES)
    except FileNotFoundError:
        raise ExportError("no such file", file=file) from None
    except OSError as error:
        raise ExportError(f"cannot be read ({error.strerror})", file=file) from None
    if not head.strip():
        raise ExportError("is empty", file=file, hint="Export it from the meter again.")
    found = next((name for bom, name in _BOMS if head.startswith(bom)), None)
    if found != "utf-16" and encoding not in ("utf-16", "utf-32") and b"\0" in head:
        raise ExportError("is binary, not text", file=file, hint="Export the readings as CSV text.")
    with TemporaryDirectory(prefix="meterlens-") as name:
        yield _inspect(file, size, encoding or found, Path(name))


def _inspect(file: Path, size: int, encoding: str | None, folder: Path) -> ExportText:
    """One pass over the bytes: hash, line ends, quotes, and whether they are UTF-8."""
    digest = hashlib.sha256()
    decoder = codecs.getincrementaldecoder("utf-8")()
    is_utf8 = True
    quotes = underscore = False
    carriage = line_feed = paired = 0
    last = b""
    with file.open("rb") as source:
        while chunk := source.read(_CHUNK):
            digest.update(chunk)
            quotes = quotes or b'"' in chunk
            underscore = underscore or b"_" in chunk
            line_feed += chunk.count(b"\n")
            if b"\r" in chunk or last == b"\r":
                carriage += chunk.count(b"\r")
                paired += chunk.count(b"\r\n") + (last == b"\r" and chunk[:1] == b"\n")
            last = chunk[-1:]
            if is_utf8 and not chunk.isascii():
                try:
                    decoder.decode(chunk)
                except UnicodeDecodeError:
                    is_utf8 = False
    chosen = encoding or ("utf-8" if is_utf8 else "cp1252")
    mixed = carriage not in (0, paired) or (paired > 0 and line_feed != paired)
    only_carriage = carriage > 0 and line_feed == 0
    plain = codecs.lookup(chosen).name in ("utf-8", "ascii") and is_utf8
    lines_path = file
    if not plain or (mixed and not only_carriage):
        lines_path = _rewritten(file, chosen, folder / "lines.txt")
    if file.stat().st_size != size:
        raise ExportError(
            "changed while it was being read", file=file, hint="Ingest it again when it is whole."
        )
    text = ExportText(
        file=file,
        lines_path=lines_path,
        size_bytes=size,
        sha256=digest.hexdigest(),
        encoding=chosen,
        has_quotes=quotes,
        has_underscore=underscore,
        head=[],
        folder=folder,
    )
    text.head = _head_lines(lines_path)
    return text


def _rewritten(file: Path, encoding: str, target: Path) -> Path:
    try:
        with (
            file.open(encoding=encoding, newline=None) as source,
            target.open("w", encoding="utf-8", newline="\n") as sink,
        ):
            while chunk := source.read(_CHUNK):
                sink.write(chunk)
    except UnicodeError as error:
        raise ExportError(
            f"is not {encoding} text ({error})",
            file=file,
            key="encoding",
            hint="Name its encoding in the column map, or leave the key out.",
        ) from None
    return target


def _head_lines(path: Path) -> list[str]:
    with path.open("rb") as source:
        head = source.read(_HEAD_BYTES)
    whole = len(head) < _HEAD_BYTES
    text = head.decode("utf-8", errors="ignore").removeprefix("\ufeff")
    lines = io.StringIO(text, newline=None).read().split("\n")
    return lines if whole else lines[:-1]
