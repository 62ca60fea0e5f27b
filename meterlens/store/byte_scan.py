"""One pass over an export's bytes: fingerprint, line ends, quotes, and which encoding it is."""

from __future__ import annotations

import codecs
import hashlib
import re
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

__all__ = ["LINE_SEPARATOR", "ByteScan", "file_chunks", "find_encoding", "mark_encoding", "scan"]

#: What the database is told to split at, so that it hands over whole lines.
LINE_SEPARATOR = "\x1d"
_CHUNK = 1 << 20
#: Broken bytes that a UTF-8 file may have however few its accents are.
_FEW = 16
_MARKS = (
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_BROKEN = re.compile("[\udc80-\udcff]")
_ACCENTED = re.compile("[^\x00-\x7f\udc80-\udcff]")


@dataclass(frozen=True)
class ByteScan:
    """What one pass over the bytes tells.

    Attributes
    ----------
    sha256 : str
    is_utf8 : bool
        Whether every byte is valid UTF-8.
    has_quotes, has_underscore, has_separator : bool
        Whether a quote, an underscore or `LINE_SEPARATOR` stands anywhere.
    has_mixed_ends : bool
        Whether lines end in more than one way.
    """

    sha256: str
    is_utf8: bool
    has_quotes: bool
    has_underscore: bool
    has_separator: bool
    has_mixed_ends: bool


def file_chunks(file: Path) -> Iterator[bytes]:
    """The bytes of a file, some at a time."""
    with file.open("rb") as source:
        while chunk := source.read(_CHUNK):
            yield chunk


class _Utf8Check:
    """Whether chunks are valid UTF-8 together; whole ASCII chunks are not decoded."""

    def __init__(self) -> None:
        self.decoder = codecs.getincrementaldecoder("utf-8")()
        self.valid, self.pending = True, False

    def take(self, chunk: bytes, *, final: bool = False) -> None:
        if not self.valid or (chunk.isascii() and not self.pending):
            return
        try:
            self.decoder.decode(chunk, final)
        except UnicodeDecodeError:
            self.valid = False
        self.pending = bool(self.decoder.getstate()[0])


def scan(file: Path) -> ByteScan:
    """Read every byte of a file once."""
    digest = hashlib.sha256()
    check = _Utf8Check()
    quotes = underscore = separator = False
    carriage = line_feed = paired = 0
    last = b""
    for chunk in file_chunks(file):
        digest.update(chunk)
        quotes = quotes or b'"' in chunk
        underscore = underscore or b"_" in chunk
        separator = separator or b"\x1d" in chunk
        line_feed += chunk.count(b"\n")
        if b"\r" in chunk or last == b"\r":
            carriage += chunk.count(b"\r")
            paired += chunk.count(b"\r\n") + (last == b"\r" and chunk[:1] == b"\n")
        last = chunk[-1:]
        check.take(chunk)
    check.take(b"", final=True)
    mixed = carriage not in (0, paired) or (paired > 0 and line_feed != paired)
    only_carriage = carriage > 0 and line_feed == 0
    return ByteScan(
        sha256=digest.hexdigest(),
        is_utf8=check.valid,
        has_quotes=quotes,
        has_underscore=underscore,
        has_separator=separator,
        has_mixed_ends=mixed and not only_carriage,
    )


def mark_encoding(head: bytes) -> str | None:
    """The encoding that a byte order mark names; None where there is none."""
    return next((name for mark, name in _MARKS if head.startswith(mark)), None)


def find_encoding(file: Path, scanned: ByteScan) -> tuple[str, str | None]:
    """The encoding of an export without a byte order mark, and a note where it is broken.

    Notes
    -----
    Windows text hardly ever holds a valid sequence of UTF-8 bytes. Where there are some,
    and not many broken ones, the file is UTF-8 with faults of transmission.
    """
    if scanned.is_utf8:
        return "utf-8", None
    decoder = codecs.getincrementaldecoder("utf-8")(errors="surrogateescape")
    broken = accented = 0
    for chunk in file_chunks(file):
        text = decoder.decode(chunk)
        if not text.isascii():
            broken += len(_BROKEN.findall(text))
            accented += len(_ACCENTED.findall(text))
    broken += len(decoder.decode(b"", True))
    if accented and broken <= max(_FEW, accented):
        count = "1 byte" if broken == 1 else f"{broken} bytes"
        return "utf-8", f"read as UTF-8, although {count} of it cannot be: shown as \ufffd"
    return "cp1252", "read as cp1252"
