"""Records of an export with quotes: a quote that never closes costs its own line only."""

from __future__ import annotations

import csv
from collections import Counter, deque
from collections.abc import Iterable, Iterator

__all__ = ["quoted_records", "usual_field_count"]

#: Lines that one quoted field may span at most.
_LONGEST_SPAN = 20


class _StrayQuoteError(Exception):
    """A quote is open that was not meant to be."""


def _fields(line: str, delimiter: str) -> list[str]:
    """The fields of one line by itself."""
    try:
        return next(csv.reader([line], delimiter=delimiter, skipinitialspace=True), [])
    except csv.Error:
        return line.split(delimiter)


def usual_field_count(lines: Iterable[str], delimiter: str) -> int:
    """The commonest number of fields above one, of lines by themselves; 0 where there is none."""
    lengths = Counter(len(_fields(line, delimiter)) for line in lines)
    lengths.pop(0, None)
    lengths.pop(1, None)
    return lengths.most_common(1)[0][0] if lengths else 0


class _Lines:
    """Lines for the csv reader, which asks for another one while a quote is open."""

    def __init__(self, source: Iterator[str], delimiter: str, usual: int) -> None:
        self.source, self.delimiter, self.usual = source, delimiter, usual
        self.taken: list[str] = []
        self.waiting: deque[str] = deque()

    def __iter__(self) -> _Lines:
        return self

    def __next__(self) -> str:
        line = self.waiting.popleft() if self.waiting else next(self.source, None)
        if line is None:
            if self.taken:
                raise _StrayQuoteError
            raise StopIteration
        self.taken.append(line)
        if len(self.taken) > 1 and (len(self.taken) > _LONGEST_SPAN or self._is_row(line)):
            raise _StrayQuoteError
        return line

    def _is_row(self, line: str) -> bool:
        """True for a whole row by itself, which no field of another row holds."""
        if self.usual < 2 or line.count('"') % 2:
            return False
        return len(_fields(line, self.delimiter)) == self.usual

    def give_back(self) -> str:
        """Keep the first line of an unfinished record; the others are read again."""
        first, *others = self.taken
        self.waiting.extendleft(reversed(others))
        self.taken = [first]
        return first


def quoted_records(
    source: Iterable[str], delimiter: str, usual: int
) -> Iterator[tuple[int, list[str]]]:
    """First line number and fields of each record.

    Parameters
    ----------
    source : iterable of str
        Lines with their line ends, each a line feed.
    delimiter : str
    usual : int
        Fields of a usual row; 0 where that is not known.

    Yields
    ------
    tuple of int and list of str
        1-based line on which the record begins; its fields.

    Notes
    -----
    A quoted field may span lines where it closes within 20 of them, none of them is a
    whole row by itself, and the record has no more fields than a row. Otherwise its quote
    is a character like any other, and the lines after it are read by themselves.
    """
    lines = _Lines(iter(source), delimiter, usual)
    number = 1
    spaced = delimiter != " "
    reader = csv.reader(lines, delimiter=delimiter, skipinitialspace=spaced)
    while True:
        try:
            record = next(reader)
            is_stray = len(lines.taken) > 1 and len(record) > usual + 1 > 1
        except StopIteration:
            return
        except (_StrayQuoteError, csv.Error):
            is_stray = True
        if is_stray:
            record = lines.give_back().rstrip("\n").split(delimiter)
            reader = csv.reader(lines, delimiter=delimiter, skipinitialspace=spaced)
        yield number, record or [""]
        number += len(lines.taken)
        lines.taken.clear()
