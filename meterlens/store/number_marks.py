"""Decimal and thousands marks, by the numbers themselves."""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path

from meterlens.errors import ExportError

__all__ = ["assumed_point", "find_decimal", "find_thousands", "grouped_pattern"]


def grouped_pattern(thousands: str, decimal: str) -> str:
    """Regular expression of a number whose thousands are grouped by three."""
    mark, point = re.escape(thousands), re.escape(decimal)
    return rf"[+-]?\d{{1,3}}({mark}\d{{3}})+({point}\d*)?"


def find_decimal(file: Path, cells: Sequence[str]) -> str:
    """The decimal mark that an export's first numbers show.

    Raises
    ------
    ExportError
        Where the marks could group thousands as well.
    """
    commas = [c for c in cells if re.fullmatch(r"[+-]?\d+,\d+", c)]
    points = [c for c in cells if re.fullmatch(r"[+-]?\d+\.\d+", c)]
    both = [c for c in cells if re.fullmatch(r"[+-]?\d{1,3}(\.\d{3})+,\d+", c)]
    if both or any(_only_decimal(c, ",") for c in commas):
        return ","
    if not commas or any(_only_decimal(c, ".") for c in points):
        return "."
    raise ExportError(
        f'"{commas[0]}" could be a decimal or a thousands mark',
        file=file,
        key="decimal",
        hint='Set decimal = "," or decimal = "." in the column map.',
    )


def _only_decimal(cell: str, mark: str) -> bool:
    """True where the mark cannot be one of thousands."""
    whole, _, rest = cell.lstrip("+-").partition(mark)
    return len(rest) != 3 or len(whole) > 3 or whole == "0" or whole.startswith("0")


def assumed_point(cells: Sequence[str]) -> str | None:
    """A number whose point could group thousands as well, where nothing tells.

    Notes
    -----
    Where every number has a point and three digits after it, it is a meter of three
    decimals; where some have none, large numbers may be the ones that are grouped.
    """
    points = [c for c in cells if re.fullmatch(r"[+-]?\d+\.\d+", c)]
    plain = [c for c in cells if re.fullmatch(r"[+-]?\d+", c)]
    if not points or not plain or any(_only_decimal(c, ".") for c in points):
        return None
    # A number of four digits without a point shows that thousands are not grouped.
    return None if any(len(c.lstrip("+-")) > 3 for c in plain) else points[0]


def find_thousands(cells: Sequence[str], decimal: str, delimiter: str) -> str | None:
    """The thousands mark of an export's first numbers; None where they show none."""
    other = "," if decimal == "." else "."
    marks = [m for m in (other, "'", "’", " ", "\u00a0", "\u202f") if m != delimiter]
    for mark in marks:
        pattern = rf"[+-]?\d{{1,3}}({re.escape(mark)}\d{{3}})+{re.escape(decimal)}\d+"
        if any(re.fullmatch(pattern, cell) for cell in cells):
            return mark
    return None
