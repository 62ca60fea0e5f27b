"""Where the header of an export stands, what separates its fields, and which field is which."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from difflib import get_close_matches

from meterlens.errors import ExportError
from meterlens.settings import ColumnMap
from meterlens.store.columns import STORE_COLUMN
from meterlens.store.export_text import ExportText

__all__ = ["Locator", "Record", "find_header", "mapped_names", "read_columns"]

#: 1-based line on which a record begins; its fields.
Record = tuple[int, list[str]]

_DELIMITERS = (";", ",", "\t", "|")
#: Without a header the comma comes last: it may be the decimal mark.
_COMMA_LAST = (";", "\t", "|", ",")
_SEARCHED_LINES = 300
_SAMPLED_LINES = 200
#: Share of the lines that must have the same number of fields.
_CONSISTENT = 0.9


def read_columns(columns: ColumnMap) -> dict[str, str | int]:
    """The mapped columns that are stored: key of the map → header or number."""
    named = columns.value_columns() | columns.text_columns()
    return {key: named[key] for key in STORE_COLUMN if key in named}


def mapped_names(columns: ColumnMap) -> list[tuple[str, str | int]]:
    """Key and header (or number) of every field that the reader needs."""
    return [("timestamp", name) for name in columns.timestamp] + [*read_columns(columns).items()]


def find_header(text: ExportText, columns: ColumnMap) -> tuple[int, str]:
    """The header of an export and its delimiter, by the names that the map gives.

    Parameters
    ----------
    text : ExportText
        Its quotes still in place.
    columns : ColumnMap

    Returns
    -------
    tuple of int and str
        0-based index of the header among the records, -1 where there is none; the delimiter.

    Raises
    ------
    ExportError
        No line reads as a header, or the stated one is not there.
    """
    if columns.header_row == 0:
        return -1, columns.delimiter or _consistent_delimiter(text, columns)
    candidates = (columns.delimiter,) if columns.delimiter else _DELIMITERS
    wanted = {_plain(str(name)) for _, name in mapped_names(columns)}
    best, index, delimiter = (-1, -1, 0), -1, candidates[0]
    for candidate in candidates:
        records = text.head_records(candidate)
        for i in _header_places(text, records, columns.header_row):
            fields = records[i][1]
            rank = (len(wanted & {_plain(f) for f in fields}), len(fields), -i)
            if rank > best:
                best, index, delimiter = rank, i, candidate
    if columns.header_row is None and best[1] < 2 and len(wanted) > 1:
        raise ExportError(
            "no line of the file reads as a table header",
            file=text.file,
            hint="Set delimiter and header_row in the column map.",
        )
    return index, delimiter


def _header_places(
    text: ExportText, records: Sequence[Record], header_row: int | None
) -> Sequence[int]:
    """Indices of the records that may be the header."""
    if header_row is None:
        return range(min(len(records), _SEARCHED_LINES))
    if header_row > len(text.head):
        raise ExportError(
            f"header_row = {header_row}, but there are {len(text.head)} lines to search",
            file=text.file,
            key="header_row",
            hint="Lines are counted from 1, blank ones included.",
        )
    return [max(i for i, (line, _) in enumerate(records) if line <= header_row)]


def _consistent_delimiter(text: ExportText, columns: ColumnMap) -> str:
    """The delimiter that gives the first lines the same number of fields, and enough of them."""
    needed = max((name for _, name in mapped_names(columns) if isinstance(name, int)), default=1)
    widest = (0, _DELIMITERS[0])
    for enough in (max(needed, 2), 2):
        for delimiter in _COMMA_LAST:
            records = text.head_records(delimiter)[:_SAMPLED_LINES]
            lengths = Counter(len(row) for _, row in records if any(f.strip() for f in row))
            length, count = max(lengths.items(), key=lambda item: item[1], default=(0, 0))
            if length >= enough and count >= _CONSISTENT * lengths.total():
                return delimiter
            widest = max(widest, (length * count, delimiter))
    return widest[1]


class Locator:
    """Finds a mapped column in the header; knows what to say where it is not there.

    Parameters
    ----------
    text : ExportText
    header : tuple of int and list of str
        Line and fields of the header.
    columns : ColumnMap
    """

    def __init__(self, text: ExportText, header: Record, columns: ColumnMap) -> None:
        self.text, self.line = text, header[0]
        self.names = [_plain(name) for name in header[1]]
        self.mapped = {_plain(str(name)) for _, name in mapped_names(columns)}

    def __call__(self, name: str | int, key: str) -> int:
        """1-based field of a mapped column."""
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
        listed = ", ".join(f'"{n}"' for n in self._nearest(wanted))
        raise ExportError(
            f'no column "{name}"',
            file=self.text.file,
            line=self.line,
            key=key,
            hint=f"Nearest in this file: {listed}. Correct {key} in the column map.",
        )

    def _nearest(self, wanted: str) -> list[str]:
        """Like names that no other key has, else any like ones, else the first."""
        shown = [n for n in self.names if n]
        free = [n for n in shown if n not in self.mapped]
        for names in (free, shown):
            near = get_close_matches(wanted, names, n=3, cutoff=0.4)
            if near:
                return near
        return (free or shown)[:8]


def _plain(name: str) -> str:
    return " ".join(name.replace("\ufeff", "").split())
