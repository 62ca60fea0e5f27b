"""Where the table of an export begins and how its fields read.

What the column map states is taken as it is; what it leaves out is found in the first
lines, by the names that the map itself gives. A decimal mark that the numbers do not
settle is an error, never a guess.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from difflib import get_close_matches

from meterlens.errors import ExportError
from meterlens.settings import ColumnMap
from meterlens.store.columns import STORE_COLUMN
from meterlens.store.export_text import ExportText
from meterlens.store.number_marks import find_decimal, find_thousands, grouped_pattern

__all__ = ["ISO_FORMATS", "Layout", "find_layout"]

ISO_FORMATS = (
    "%Y-%m-%dT%H:%M:%S",
    "%Y-%m-%d %H:%M:%S",
    "%Y-%m-%dT%H:%M",
    "%Y-%m-%d %H:%M",
    "%Y-%m-%dT%H:%M:%S.%f",
    "%Y-%m-%d %H:%M:%S.%f",
)
_ISO_OFFSET_FORMATS = tuple(f + "%z" for f in ISO_FORMATS)
_DELIMITERS = (";", ",", "\t", "|")
_DIGITS = re.compile(r"\d")


@dataclass(frozen=True)
class Layout:
    """How the lines of one export split and convert.

    Attributes
    ----------
    delimiter, decimal : str
    thousands : str or None
    time_fields : tuple of int
        1-based fields of the stamp, one or two.
    value_fields : dict of str to int
        Key of the column map → 1-based field.
    time_formats : tuple of str
        Formats to try in turn; ``("epoch",)`` for seconds since 1970.
    field_count : int
        Fields of a whole row.
    first_line : int
        0-based index of the first line after the header and the units row.
    """

    delimiter: str
    decimal: str
    thousands: str | None
    time_fields: tuple[int, ...]
    value_fields: dict[str, int]
    time_formats: tuple[str, ...]
    field_count: int
    first_line: int

    @property
    def grouped_pattern(self) -> str | None:
        """Regular expression of a number with grouped thousands; None where none are used."""
        if self.thousands is None:
            return None
        return grouped_pattern(self.thousands, self.decimal)


def find_layout(text: ExportText, columns: ColumnMap) -> Layout:
    """Find the header, the fields and the marks of an export.

    Parameters
    ----------
    text : ExportText
        The opened export; its quotes are taken out on the way.
    columns : ColumnMap
        The map of its service.

    Returns
    -------
    Layout

    Raises
    ------
    ExportError
        No header, a mapped column that is not there (with the nearest names in the file),
        a column named twice, no row after the header, a decimal mark that the numbers do
        not settle.
    """
    header_index, delimiter = _find_header(text, columns)
    text.without_quotes(delimiter)
    head = _split_head(text, delimiter)
    names = [] if columns.header_row == 0 else head[header_index]
    locate = _Locator(text, names, header_index + 1)
    time_fields = tuple(locate(name, "timestamp") for name in columns.timestamp)
    value_fields = {key: locate(name, key) for key, name in read_columns(columns).items()}
    formats = _time_formats(columns)
    first = 0 if columns.header_row == 0 else header_index + 1
    first = _after_units_row(head, first, columns, time_fields, value_fields)
    body = [row for row in head[first:] if any(f.strip() for f in row)]
    if not body:
        raise ExportError(
            "has no rows after its header", file=text.file, line=first or 1, hint="Export it again."
        )
    cells = _number_cells(body, value_fields)
    decimal = columns.decimal or find_decimal(text.file, cells)
    thousands = columns.thousands or find_thousands(cells, decimal, delimiter)
    return Layout(
        delimiter=text.delimiter or delimiter,
        decimal=decimal,
        thousands=thousands,
        time_fields=time_fields,
        value_fields=value_fields,
        time_formats=_likeliest_first(formats, body, time_fields),
        field_count=_field_count(names, body),
        first_line=first,
    )


def read_columns(columns: ColumnMap) -> dict[str, str | int]:
    """The mapped columns that are stored: key of the map → header or number."""
    named = columns.value_columns() | columns.text_columns()
    return {key: named[key] for key in STORE_COLUMN if key in named}


class _Locator:
    """Finds a mapped column in the header; knows what to say where it is not there."""

    def __init__(self, text: ExportText, names: list[str], line: int) -> None:
        self.text, self.line = text, line
        self.names = [_plain(name) for name in names]

    def __call__(self, name: str | int, key: str) -> int:
        if isinstance(name, int):
            return name
        wanted = _plain(name)
        places = [i for i, header in enumerate(self.names, 1) if header == wanted]
        if len(places) == 1:
            return places[0]
        if places:
            raise ExportError(
                f'column "{name}" stands {len(places)} times in the header',
                file=self.text.file,
                line=self.line,
                key=key,
                hint="Set header_row = 0 and map the columns by number.",
            )
        shown = [n for n in self.names if n]
        near = get_close_matches(wanted, shown, n=3, cutoff=0.4) or shown[:8]
        listed = ", ".join(f'"{n}"' for n in near)
        raise ExportError(
            f'no column "{name}"',
            file=self.text.file,
            line=self.line,
            key=key,
            hint=f"Nearest in this file: {listed}. Correct {key} in the column map.",
        )


def _plain(name: str) -> str:
    return " ".join(name.replace("\ufeff", "").split())


def _split(line: str, delimiter: str) -> list[str]:
    fields = line.split(delimiter)
    if '"' in line:
        fields = [f.strip().strip('"') for f in fields]
    return fields


def _find_header(text: ExportText, columns: ColumnMap) -> tuple[int, str]:
    """Index of the header line and the delimiter, by the names the map gives."""
    candidates: Sequence[str] = (columns.delimiter,) if columns.delimiter else _DELIMITERS
    lines = text.head
    if columns.header_row == 0:
        return -1, max(candidates, key=lambda d: sum(line.count(d) for line in lines[:200]))
    wanted = {_plain(str(n)) for n in (*columns.timestamp, *read_columns(columns).values())}
    if columns.header_row is not None:
        index = columns.header_row - 1
        if index >= len(lines):
            raise ExportError(
                f"header_row = {columns.header_row}, but the file has {len(lines)} lines",
                file=text.file,
                key="header_row",
                hint="Lines are counted from 1, blank ones included.",
            )
        rows: Sequence[int] = (index,)
    else:
        rows = range(min(len(lines), 300))
    best = max(
        ((i, d) for i in rows for d in candidates),
        key=lambda place: (
            len(wanted & {_plain(f) for f in _split(lines[place[0]], place[1])}),
            lines[place[0]].count(place[1]),
            -place[0],
        ),
    )
    if columns.header_row is None and not lines[best[0]].count(best[1]) and len(wanted) > 1:
        raise ExportError(
            "no line of the file reads as a table header",
            file=text.file,
            hint="Set delimiter and header_row in the column map.",
        )
    return best


def _split_head(text: ExportText, delimiter: str) -> list[list[str]]:
    if text.delimiter == delimiter:
        return [line.split(delimiter) for line in text.head]
    with text.lines_path.open(encoding="utf-8") as source:
        lines = [line.rstrip("\n") for line, _ in zip(source, range(2000), strict=False)]
    return [line.removeprefix("\ufeff").split(text.delimiter) for line in lines]


def _time_formats(columns: ColumnMap) -> tuple[str, ...]:
    if columns.timestamp_format is not None:
        return (columns.timestamp_format,)
    return _ISO_OFFSET_FORMATS if columns.clock == "offset" else ISO_FORMATS


def _stamp(row: list[str], time_fields: tuple[int, ...]) -> str:
    return " ".join(row[i - 1].strip() for i in time_fields if i <= len(row))


def _reads(stamp: str, pattern: str) -> bool:
    if pattern == "epoch":
        return bool(re.fullmatch(r"\d+(\.\d+)?", stamp))
    try:
        datetime.strptime(stamp.replace("24:00", "00:00"), pattern)
    except ValueError:
        return False
    return True


def _likeliest_first(
    formats: tuple[str, ...], body: list[list[str]], time_fields: tuple[int, ...]
) -> tuple[str, ...]:
    """The same formats, with the one that reads most of the first rows in front."""
    if len(formats) == 1:
        return formats
    stamps = [_stamp(row, time_fields) for row in body[:20]]
    return tuple(sorted(formats, key=lambda f: -sum(_reads(s, f) for s in stamps)))


def _after_units_row(
    head: list[list[str]],
    first: int,
    columns: ColumnMap,
    time_fields: tuple[int, ...],
    value_fields: dict[str, int],
) -> int:
    """Skip the units row, stated or found: mapped cells without a digit, no stamp."""
    following = next(
        (i for i in range(first, len(head)) if any(f.strip() for f in head[i])), len(head)
    )
    if columns.units_row is not None:
        return following + 1 if columns.units_row else first
    if columns.header_row == 0 or following == len(head):
        return first
    row = head[following]
    cells = [row[i - 1].strip() for i in value_fields.values() if i <= len(row)]
    worded = [c for c in cells if c]
    numberless = worded and not any(_DIGITS.search(c) for c in worded)
    missing = all(c in columns.missing for c in worded)
    if numberless and not missing and not _DIGITS.search(_stamp(row, time_fields)):
        return following + 1
    return first


def _number_cells(body: list[list[str]], value_fields: dict[str, int]) -> list[str]:
    fields = [i - 1 for key, i in value_fields.items() if not key.startswith("lead_lag_")]
    return [row[i].strip() for row in body for i in fields if i < len(row)]


def _field_count(names: list[str], body: list[list[str]]) -> int:
    """Fields of a whole row: the header's, or one more where rows end in a delimiter."""
    common, _ = Counter(len(row) for row in body[:500]).most_common(1)[0]
    if not names:
        return common
    trailing = sum(len(row) == len(names) + 1 and not row[-1].strip() for row in body[:500])
    if trailing * 2 > len(body[:500]):
        return len(names) + 1
    return len(names)
