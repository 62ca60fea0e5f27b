"""From true records to the exports of four different meters.

Every line of an export carries the outcome it must have when it is read once, in the
order of the files: stored, replaced, duplicate or rejected. So the expected counts are
counted from what was planted, not from a reader.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field, replace
from pathlib import Path

from generator.planted import BY_KEY


@dataclass(frozen=True)
class BadValue:
    """A single impossible value that must be set aside, the rest of its row stored."""

    column: str
    text: str
    reason: str


@dataclass(frozen=True)
class Line:
    """One line after the header.

    Attributes
    ----------
    fields : tuple of str
        What is printed.
    start : int
        Start of its interval, seconds since 1970 (UTC).
    outcome : str
        `stored`, `replaced`, `duplicate` or `rejected`.
    reason : str
        Why a rejected line is rejected.
    bad_values : tuple of BadValue
        Values to be set aside.
    """

    fields: tuple[str, ...]
    start: int
    outcome: str = "stored"
    reason: str = ""
    bad_values: tuple[BadValue, ...] = ()


@dataclass(frozen=True)
class Export:
    """One file as a meter wrote it.

    Attributes
    ----------
    name : str
        File name.
    service : str
        Service id.
    head : tuple of str
        Every line up to the header and its row of units.
    lines : tuple of Line
        The rows.
    delimiter, newline, encoding : str
        How it is written.
    """

    name: str
    service: str
    head: tuple[str, ...]
    lines: tuple[Line, ...] = field(repr=False)
    delimiter: str = ","
    newline: str = "\n"
    encoding: str = "utf-8"

    def write(self, folder: Path) -> None:
        """Write the file into a folder."""
        rows = [*self.head, *(self.delimiter.join(line.fields) for line in self.lines), ""]
        (folder / self.name).write_bytes(self.newline.join(rows).encode(self.encoding))

    def expected(self) -> dict[str, object]:
        """Return the expected outcome of reading this file, by interface key."""
        outcomes = Counter(line.outcome for line in self.lines)
        rejects: list[dict[str, object]] = []
        for number, line in enumerate(self.lines, start=len(self.head) + 1):
            if line.outcome == "rejected":
                rejects.append({"line": number, "column": None, "reason": line.reason})
            rejects += [
                {"line": number, "column": bad.column, "reason": bad.reason, "text": bad.text}
                for bad in line.bad_values
            ]
        return {
            "file": f"exports/{self.name}",
            "service": self.service,
            "rows_read": len(self.lines),
            "rows_stored": outcomes["stored"],
            "rows_replaced": outcomes["replaced"],
            "rows_duplicate": outcomes["duplicate"],
            "rows_rejected": outcomes["rejected"],
            "values_rejected": sum(len(line.bad_values) for line in self.lines),
            "rejects": rejects,
        }


def without(lines: list[Line], starts: set[int]) -> list[Line]:
    """Return the lines but those of some intervals: a gap."""
    return [line for line in lines if line.start not in starts]


def position(lines: list[Line], start: int) -> int:
    """Return where the line of an interval stands."""
    return next(index for index, line in enumerate(lines) if line.start == start)


def spoil(lines: list[Line], start: int, fields: tuple[str, ...], reason: str) -> None:
    """Print something unusable in place of an interval's row."""
    lines[position(lines, start)] = Line(fields, start, "rejected", reason)


def change_field(lines: list[Line], start: int, column: int, text: str, *bad: BadValue) -> None:
    """Print another text in one field of an interval's row."""
    index = position(lines, start)
    fields = list(lines[index].fields)
    fields[column] = text
    lines[index] = replace(lines[index], fields=tuple(fields), bad_values=bad)


def again(lines: list[Line]) -> list[Line]:
    """Return the same lines once more, which must change nothing."""
    return [replace(line, outcome="duplicate") for line in lines]


def starts_of(key: str, first: int, last: int, interval_min: int) -> list[int]:
    """Return the interval starts in [first, last).

    Where every interval of the span is meant, the count must be that of the table.

    Raises
    ------
    ValueError
        If the table of planted things names another number of rows.
    """
    starts = list(range(first, last, 60 * interval_min))
    whole = BY_KEY[key].kind not in ("broken-rows", "impossible-values")
    if whole and BY_KEY[key].rows != len(starts):
        raise ValueError(f"{key}: {BY_KEY[key].rows} rows in the table, {len(starts)} in its span")
    return starts
