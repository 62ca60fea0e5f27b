"""Which time formats an export's stamps are tried with."""

from __future__ import annotations

import re
from collections.abc import Sequence
from datetime import datetime

from meterlens.settings import ColumnMap

__all__ = ["ISO_FORMATS", "has_offset", "joined_stamp", "likeliest_first", "offset_rule"]

ISO_FORMATS = (
    "%Y-%m-%dT%H:%M:%S",
    "%Y-%m-%d %H:%M:%S",
    "%Y-%m-%dT%H:%M",
    "%Y-%m-%d %H:%M",
    "%Y-%m-%dT%H:%M:%S.%f",
    "%Y-%m-%d %H:%M:%S.%f",
)
_ISO_OFFSET_FORMATS = tuple(f + "%z" for f in ISO_FORMATS)
_NO_OFFSET = re.compile(r"([Zz]|[+-]00:?00)$")
_OFFSET = re.compile(r"\d([Zz]|[+-]\d\d:?\d\d)$")


def offset_rule(columns: ColumnMap) -> str | None:
    """What becomes of an offset at a stamp's end.

    Parameters
    ----------
    columns : ColumnMap

    Returns
    -------
    str or None
        ``read``: it is part of the time, and Z is +00:00. ``none-but-utc``: Z and +00:00
        say what is known already, others make it no time. None: as the format says.
    """
    pattern = columns.timestamp_format
    if columns.clock == "offset":
        return "read" if pattern is None or pattern.endswith("%z") else None
    return "none-but-utc" if columns.clock == "utc" and pattern is None else None


def joined_stamp(row: Sequence[str], time_fields: tuple[int, ...]) -> str:
    """The printed stamp of a row, of one field or two."""
    return " ".join(row[i - 1].strip() for i in time_fields if i <= len(row))


def has_offset(stamp: str) -> bool:
    """True where a stamp ends in Z or an offset from UTC."""
    return _OFFSET.search(stamp) is not None


def likeliest_first(
    columns: ColumnMap, rows: Sequence[Sequence[str]], time_fields: tuple[int, ...]
) -> tuple[str, ...]:
    """The formats to try, with the one that reads most of the first rows in front.

    Parameters
    ----------
    columns : ColumnMap
    rows : sequence of sequences of str
        Fields of the first rows.
    time_fields : tuple of int
        1-based fields of the stamp.
    """
    if columns.timestamp_format is not None:
        return (columns.timestamp_format,)
    formats = _ISO_OFFSET_FORMATS if columns.clock == "offset" else ISO_FORMATS
    stamps = [joined_stamp(row, time_fields) for row in rows[:20]]
    if offset_rule(columns) == "none-but-utc":
        stamps = [_NO_OFFSET.sub("", stamp) for stamp in stamps]
    return tuple(sorted(formats, key=lambda f: -sum(_reads(s, f) for s in stamps)))


def _reads(stamp: str, pattern: str) -> bool:
    try:
        datetime.strptime(stamp.replace("24:00", "00:00"), pattern)
    except ValueError:
        return False
    return True
