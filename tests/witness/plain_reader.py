"""Read a meter's export in plain loops: what each line is worth, by the interface's words.

Nothing of the program is used here. A line is judged alone and in file order, so the
result can be followed with a finger: stored, replaced, duplicate or rejected.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from itertools import pairwise
from zoneinfo import ZoneInfo

PHASES = ("a", "b", "c")
PF_LIMIT = 1.005  # a printed |PF| beyond it is impossible, up to it rounding of the meter

Cell = float | str | None
Row = dict[str, Cell]


@dataclass(frozen=True)
class ExportMap:
    """How one export reads: the witness's own copy of a column map.

    `columns` lists every column of the file as (key, header, unit); key ``""`` is a column
    the map does not name, ``"timestamp"`` may stand twice (date and time).
    """

    zone: str
    columns: tuple[tuple[str, str, str], ...]
    clock: str = "local"
    stamp: str = "start"
    stamp_format: str = ""
    interval_min: int = 15
    pf_convention: str = "unsigned"
    pf_percent: bool = False
    assume: str = "lagging"
    lagging_sign: str = "negative"
    delimiter: str = ","
    decimal: str = "."
    thousands: str = ""
    encoding: str = "utf-8"
    header_row: int = 1
    units_row: bool = False
    missing: tuple[str, ...] = ("---", "n/a", "")
    scale: dict[str, float] = field(default_factory=dict)


@dataclass
class Reading:
    """What came of a file: counts, rejects and the intervals by their UTC start."""

    rows_read: int = 0
    rows_stored: int = 0
    rows_replaced: int = 0
    rows_duplicate: int = 0
    rows_rejected: int = 0
    outcomes: dict[int, str] = field(default_factory=dict)
    row_rejects: list[int] = field(default_factory=list)
    value_rejects: list[tuple[int, str]] = field(default_factory=list)
    intervals: dict[datetime, Row] = field(default_factory=dict)

    def judge(self, line: int, outcome: str) -> None:
        """Give a line its one outcome."""
        self.outcomes[line] = outcome
        setattr(self, f"rows_{outcome}", getattr(self, f"rows_{outcome}") + 1)
        if outcome == "rejected":
            self.row_rejects.append(line)


def read_export(raw: bytes, export_map: ExportMap) -> Reading:
    """Read a whole export, line by line.

    Parameters
    ----------
    raw : bytes
        The file as it lies on the disk.
    export_map : ExportMap
        How it reads.

    Returns
    -------
    Reading
        Counts, rejects and intervals, starts in naive UTC.
    """
    reading = Reading()
    skipped = export_map.header_row + (1 if export_map.units_row else 0)
    lines = [line.rstrip("\r") for line in raw.decode(export_map.encoding).split("\n")]
    rows = [
        (number, line.split(export_map.delimiter))
        for number, line in enumerate(lines, start=1)
        if number > skipped and line.strip()
    ]
    reading.rows_read = len(rows)
    printed = printed_instants(rows, export_map)
    back = timedelta(minutes=export_map.interval_min if export_map.stamp == "end" else 0)
    for number, cells in rows:
        instant = printed[number]
        if instant is None:
            reading.judge(number, "rejected")
            continue
        row, impossible = convert(cells, export_map)
        reading.value_rejects += [(number, key) for key in impossible]
        if all(value is None for value in row.values()):
            reading.judge(number, "rejected")
            continue
        reading.judge(number, settle(reading.intervals, instant - back, row))
    return reading


def settle(intervals: dict[datetime, Row], start: datetime, row: Row) -> str:
    """Put a good row beside what is stored and say what it did."""
    stored = intervals.get(start)
    if stored is None:
        intervals[start] = row
        return "stored"
    changes = fills = False
    for key, value in row.items():
        if value is None or value == stored[key]:
            continue
        if stored[key] is None:
            fills = True
        else:
            changes = True
        stored[key] = value
    if changes:
        return "replaced"
    return "stored" if fills else "duplicate"


def convert(cells: list[str], export_map: ExportMap) -> tuple[Row, list[str]]:
    """Turn a row's texts into values; name the columns whose value cannot be."""
    row: Row = {}
    impossible: list[str] = []
    for cell, (key, _, _) in zip(cells, export_map.columns, strict=True):
        text = cell.strip()
        if key in ("", "timestamp", "quality"):
            continue
        if key.startswith("lead_lag"):
            row[key] = text or None
            continue
        if key.startswith("pf") and export_map.pf_convention == "suffix":
            text, _, word = text.partition(" ")
            row["lead_lag_" + key[-1]] = word or None
        row[key] = None
        if text in export_map.missing:
            continue
        value = number_of(text, export_map) * export_map.scale.get(key, 1.0)
        if possible(key, value, export_map):
            row[key] = value
        else:
            impossible.append(key)
            if key.startswith("pf") and f"lead_lag_{key[-1]}" in row:
                row[f"lead_lag_{key[-1]}"] = None
    return row, impossible


def number_of(text: str, export_map: ExportMap) -> float:
    """A printed number; NaN where the text is none."""
    if export_map.thousands:
        text = text.replace(export_map.thousands, "")
    try:
        return float(text.replace(export_map.decimal, "."))
    except ValueError:
        return math.nan


def possible(key: str, value: float, export_map: ExportMap) -> bool:
    """Whether a converted value can be: finite, no negative V or I, no |PF| > 1.005."""
    if not math.isfinite(value):
        return False
    if key.startswith("pf"):
        return abs(value) / (100.0 if export_map.pf_percent else 1.0) <= PF_LIMIT
    return value >= 0.0


def printed_instants(
    rows: list[tuple[int, list[str]]], export_map: ExportMap
) -> dict[int, datetime | None]:
    """The printed stamp of every line as naive UTC; None where no time can be had."""
    choices: list[tuple[int, list[datetime]]] = []
    for number, cells in rows:
        naive = None
        if len(cells) == len(export_map.columns):
            naive = naive_stamp(cells, export_map)
        choices.append((number, [] if naive is None else utc_candidates(naive, export_map)))
    resolved = {number: (found[0] if len(found) == 1 else None) for number, found in choices}
    usable = [(number, found) for number, found in choices if found]
    step = timedelta(minutes=export_map.interval_min) * direction(usable)
    for walk, stride in ((usable, step), (usable[::-1], -step)):
        for (before, _), (number, found) in pairwise(walk):
            neighbour = resolved[before]
            if resolved[number] is None and neighbour is not None:
                expected = neighbour + stride
                resolved[number] = expected if expected in found else None
    return resolved


def naive_stamp(cells: list[str], export_map: ExportMap) -> datetime | None:
    """The clock reading a line prints, or None; ``24:00`` is the next day's midnight."""
    texts = [
        cell.strip()
        for cell, (key, _, _) in zip(cells, export_map.columns, strict=True)
        if key == "timestamp"
    ]
    text = " ".join(texts)
    late = "24:00" in text
    if late:
        text = text.replace("24:00", "00:00")
    try:
        if export_map.stamp_format:
            clock_time = datetime.strptime(text, export_map.stamp_format)
        else:
            clock_time = datetime.fromisoformat(text)
    except ValueError:
        return None
    return clock_time + timedelta(days=1) if late else clock_time


def utc_candidates(clock_time: datetime, export_map: ExportMap) -> list[datetime]:
    """Every UTC instant at which the clock could have shown this: none, one or two."""
    if export_map.clock == "utc":
        return [clock_time]
    zone = ZoneInfo(export_map.zone)
    found: list[datetime] = []
    for fold in (0, 1):
        instant = clock_time.replace(tzinfo=zone, fold=fold).astimezone(UTC)
        shown = instant.astimezone(zone).replace(tzinfo=None, fold=0)
        naive = instant.replace(tzinfo=None)
        if shown == clock_time and naive not in found:
            found.append(naive)
    return found


def direction(usable: list[tuple[int, list[datetime]]]) -> int:
    """+1 for a file that runs forward in time, −1 for newest first, by majority."""
    forward = 0
    for (_, before), (_, after) in pairwise(usable):
        forward += (after[0] > before[0]) - (after[0] < before[0])
    return 1 if forward >= 0 else -1
