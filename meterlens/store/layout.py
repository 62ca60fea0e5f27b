"""Where the table of an export begins and how its fields read.

What the column map states is taken as it is; what it leaves out is found in the first
lines, by the names that the map itself gives. A decimal comma that the numbers do not
settle is an error, never a guess.
"""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

from meterlens.errors import ExportError
from meterlens.settings import ColumnMap
from meterlens.store.export_text import ExportText
from meterlens.store.header import Locator, Record, find_header, mapped_names, read_columns
from meterlens.store.number_marks import (
    assumed_point,
    find_decimal,
    find_thousands,
    grouped_pattern,
)
from meterlens.store.stamp_formats import joined_stamp, likeliest_first, offset_rule

__all__ = ["Layout", "find_layout"]

_DIGITS = re.compile(r"\d")
_SAMPLED_ROWS = 500


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
    offset_rule : str or None
        What becomes of an offset at a stamp's end, see `stamp_formats.offset_rule`.
    field_count : int
        Fields of a whole row.
    first_line : int
        0-based index of the first record after the header and the units row.
    """

    delimiter: str
    decimal: str
    thousands: str | None
    time_fields: tuple[int, ...]
    value_fields: dict[str, int]
    time_formats: tuple[str, ...]
    offset_rule: str | None
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
    header_index, delimiter = find_header(text, columns)
    records = text.head_records(delimiter)
    header: Record = (1, []) if header_index < 0 else records[header_index]
    locate = Locator(text, header, columns)
    time_fields = tuple(locate(name, "timestamp") for name in columns.timestamp)
    value_fields = {key: locate(name, key) for key, name in read_columns(columns).items()}
    text.without_quotes(delimiter)
    head = [fields for _, fields in records]
    first = _after_units_row(head, header_index + 1, columns, time_fields, value_fields)
    body = [row for row in head[first:] if any(f.strip() for f in row)]
    if not body:
        raise ExportError(
            "has no rows after its header",
            file=text.file,
            line=header[0],
            hint="Export it again.",
        )
    field_count = _field_count(header[1], body)
    _check_numbers(text, columns, field_count)
    split_at = text.delimiter or delimiter
    decimal, thousands = _number_marks(text, columns, _number_cells(body, value_fields), split_at)
    return Layout(
        delimiter=split_at,
        decimal=decimal,
        thousands=thousands,
        time_fields=time_fields,
        value_fields=value_fields,
        time_formats=likeliest_first(columns, body, time_fields),
        offset_rule=offset_rule(columns),
        field_count=field_count,
        first_line=first,
    )


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
    if numberless and not missing and not _DIGITS.search(joined_stamp(row, time_fields)):
        return following + 1
    return first


def _number_cells(body: list[list[str]], value_fields: dict[str, int]) -> list[str]:
    fields = [i - 1 for key, i in value_fields.items() if not key.startswith("lead_lag_")]
    return [row[i].strip() for row in body for i in fields if i < len(row)]


def _number_marks(
    text: ExportText, columns: ColumnMap, cells: list[str], split_at: str
) -> tuple[str, str | None]:
    """Decimal and thousands marks, stated or found; an assumption is noted."""
    decimal = columns.decimal or find_decimal(text.file, cells)
    thousands = columns.thousands or find_thousands(cells, decimal, split_at)
    if columns.decimal is None and columns.thousands is None and split_at != ",":
        printed = assumed_point(cells) if decimal == "." and thousands is None else None
        if printed is not None:
            text.notes.append(
                f'"{printed}" is read with a decimal point; where the point groups thousands, '
                'set decimal = "," and thousands = "."'
            )
    return decimal, thousands


def _check_numbers(text: ExportText, columns: ColumnMap, field_count: int) -> None:
    """Columns mapped by number must be there."""
    for key, number in mapped_names(columns):
        if isinstance(number, int) and number > field_count:
            raise ExportError(
                f"column {number} is mapped, but the rows have {field_count} columns",
                file=text.file,
                key=key,
                hint="Columns are counted from 1; check delimiter in the column map too.",
            )


def _field_count(names: list[str], body: list[list[str]]) -> int:
    """Fields of a whole row: the header's, or one more where rows end in a delimiter."""
    sample = body[:_SAMPLED_ROWS]
    if not names:
        return Counter(len(row) for row in sample).most_common(1)[0][0]
    trailing = sum(len(row) == len(names) + 1 and not row[-1].strip() for row in sample)
    return len(names) + 1 if trailing * 2 > len(sample) else len(names)
