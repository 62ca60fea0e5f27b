"""Which lines of an export are rows, which values can be, and why the rest is rejected."""

from __future__ import annotations

import duckdb
import numpy as np
import numpy.typing as npt
import pyarrow as pa

from meterlens.electrical.conventions import PF_CLAMP_BOUND, FloatArray
from meterlens.errors import ExportError
from meterlens.settings import ColumnMap
from meterlens.store import timestamps
from meterlens.store.columns import STORE_COLUMN
from meterlens.store.export_rows import ExportRows, Reject
from meterlens.store.export_text import FIELD_SEPARATOR, ExportText
from meterlens.store.interval_length import interval_length
from meterlens.store.layout import Layout
from meterlens.store.query_files import load_query
from meterlens.store.stamp_formats import has_offset, joined_stamp
from meterlens.store.zones import IntArray

__all__ = ["RowJudge"]

_NO_TIME = "no usable time"
_NO_YEAR = f"{_NO_TIME}: not in the years 1970 to 2099"
_FIELDS = "wrong number of fields"
_EMPTY = "no measurement at all"
#: Stamps outside are torn or of a clock that was never set.
_LATEST = int(np.datetime64("2100-01-01", "us").astype(np.int64))
#: Digits of seconds since 1970 in the years that are read.
_EPOCH_DIGITS = 10

_BoolArray = npt.NDArray[np.bool_]


class RowJudge:
    """Decides line by line what is a row, what is rejected, and why."""

    def __init__(
        self,
        con: duckdb.DuckDBPyConnection,
        text: ExportText,
        layout: Layout,
        columns: ColumnMap,
    ) -> None:
        self.con, self.text, self.layout, self.columns = con, text, layout, columns
        self.row_rejects: list[Reject] = []

    def rows(self, table: pa.Table, zone_name: str) -> ExportRows:
        """Usable rows of the converted lines."""
        table = table.slice(self.layout.first_line)
        position = np.arange(self.layout.first_line, self.layout.first_line + table.num_rows)
        counts = table["field_count"].to_numpy()
        # An empty line comes as null; one of blanks alone is looked at as text below.
        present = ~np.isnan(counts) if counts.dtype.kind == "f" else np.ones(len(counts), bool)
        printed = _integers(table["printed_us"])
        whole = present & (counts == self.layout.field_count)
        keep = whole & _within_years(printed)
        if not keep.any():
            self._no_row_at_all(position, present & whole, printed)
        blank = self._reject_lines(position, present & ~keep, whole, printed)
        interval = interval_length(self.text.file, printed[keep], self.columns)
        stamps = timestamps.read_stamps(
            printed[keep], self.columns.clock, self.columns.stamp, zone_name, interval
        )
        usable = self._usable_stamps(position[keep], stamps)
        chosen = np.flatnonzero(keep)[usable]
        values = {
            key: _floats(table[key], chosen, self.columns.scale.get(key, 1.0))
            for key in self.layout.value_fields
        }
        where = position[chosen]
        value_rejects, clamped = self._impossible_values(values, where)
        measured = _has_measurement(values)
        self._add_rejects(where[~measured], _EMPTY)
        kept: slice | _BoolArray = slice(None) if measured.all() else measured
        return ExportRows(
            text=self.text,
            interval_min=interval,
            rows_read=int(np.count_nonzero(present)) - blank,
            line=self._lines(where[kept]),
            start_utc=stamps.start_utc[usable][kept],
            values={STORE_COLUMN[key]: x[kept] for key, x in values.items()},
            row_rejects=sorted(self.row_rejects, key=lambda r: r.line),
            value_rejects=value_rejects,
            values_clamped=clamped,
            notes=[*self._notes(stamps), *_doubtful_unit(value_rejects, int(keep.sum()))],
        )

    def _notes(self, stamps: timestamps.StampReading) -> list[str]:
        """What was found or assumed where the map left it open."""
        notes = list(self.text.notes)
        if stamps.either_way:
            notes.append(
                f"{stamps.either_way} rows of an hour that came twice fit both passes alike: "
                "read as the first"
            )
        if self.columns.quality is not None:
            notes.append(
                f'the status column "{self.columns.quality}" is not used by this version: '
                "estimated readings are kept like any other"
            )
        return notes

    def _lines(self, position: IntArray) -> IntArray:
        """1-based line of the export of each record."""
        if self.text.line_numbers is not None:
            return self.text.line_numbers[position]
        return np.asarray(position + 1)

    def _texts(self, position: IntArray) -> list[str]:
        """The text of each record; quoted fields come apart with a semicolon."""
        return [text.replace(FIELD_SEPARATOR, "; ") for text in self._plain_texts(position)]

    def _plain_texts(self, position: IntArray) -> list[str]:
        if len(position) == 0:
            return []
        query = load_query("ingest/line_text").text
        parameters = {"path": str(self.text.lines_path), "lines": (position + 1).tolist()}
        found = dict(self.con.execute(query, parameters).fetchall())
        return [found.get(int(p) + 1, "") for p in position]

    def _reject_lines(
        self, position: IntArray, bad: _BoolArray, whole: _BoolArray, printed: IntArray
    ) -> int:
        """Reject lines without the right fields or a time; returns how many were blank."""
        blank = 0
        texts = self._texts(position[bad])
        lines = self._lines(position[bad])
        read = printed[bad] != timestamps.NOT_A_TIME
        for line, text, has_fields, is_read in zip(lines, texts, whole[bad], read, strict=True):
            if not text.strip():
                blank += 1
                continue
            reason = (_NO_YEAR if is_read else _NO_TIME) if has_fields else _FIELDS
            self.row_rejects.append(Reject(int(line), None, reason, text))
        return blank

    def _usable_stamps(self, position: IntArray, stamps: timestamps.StampReading) -> _BoolArray:
        """Which rows have a start; the others are rejected."""
        for code, reason in timestamps.OUTCOME_REASONS.items():
            self._add_rejects(position[stamps.fault == code], f"{_NO_TIME}: {reason}")
        known = stamps.start_utc != timestamps.NOT_A_TIME
        usable: _BoolArray = known & _within_years(stamps.start_utc)
        self._add_rejects(position[known & ~usable], _NO_YEAR)
        return usable

    def _add_rejects(self, position: IntArray, reason: str) -> None:
        for line, text in zip(self._lines(position), self._texts(position), strict=True):
            self.row_rejects.append(Reject(int(line), None, reason, text))

    def _no_row_at_all(self, position: IntArray, whole: _BoolArray, printed: IntArray) -> None:
        if not whole.any():
            raise ExportError(
                f"no row has the header's {self.layout.field_count} fields",
                file=self.text.file,
                line=int(self._lines(position[:1])[0]) if len(position) else None,
                hint="Check delimiter and header_row in the column map.",
            )
        read = whole & (printed != timestamps.NOT_A_TIME)
        first = position[read if read.any() else whole][:1]
        fields = self._plain_texts(first)[0].split(self.layout.delimiter)
        stamp = joined_stamp(fields, self.layout.time_fields)
        expected = self.columns.timestamp_format or "ISO 8601"
        raise ExportError(
            f'"{stamp}" is not in the years 1970 to 2099, read as {expected}'
            if read.any()
            else f'"{stamp}" is not a time of the form {expected}',
            file=self.text.file,
            line=int(self._lines(first)[0]),
            key="timestamp_format",
            hint=self._format_hint(stamp),
        )

    def _format_hint(self, stamp: str) -> str:
        is_epoch = self.columns.timestamp_format == "epoch"
        if is_epoch and len(stamp.partition(".")[0]) > _EPOCH_DIGITS:
            return "It looks like milliseconds: epoch counts seconds. Export the times as text."
        if has_offset(stamp) and self.columns.clock != "offset":
            return 'It has an offset from UTC: set clock = "offset" in the column map.'
        return "Set timestamp_format to what the file prints."

    def _impossible_values(
        self, values: dict[str, FloatArray], position: IntArray
    ) -> tuple[list[Reject], int]:
        """Blank what cannot be, and name each such cell."""
        unity = 100.0 if self.columns.pf_unit == "percent" else 1.0
        cells: list[tuple[IntArray, str, str]] = []
        clamped = 0
        for key, x in values.items():
            faults = [(~np.isfinite(x), _not_a_value(key))]
            if key.startswith(("v_", "i_")):
                kind = "voltage" if key.startswith("v_") else "current"
                faults.append(((x < 0) & np.isfinite(x), f"a negative {kind}"))
            elif key.startswith("pf_"):
                size = np.abs(x)
                # Over unity first: 1.005 × 100 is a hair under 100.5.
                above = (size / unity > PF_CLAMP_BOUND) & np.isfinite(x)
                faults.append((above, "a power factor above 1"))
                clamped += int(np.count_nonzero((size > unity) & np.isfinite(x) & ~above))
            for bad, reason in faults:
                if bad.any():
                    x[bad] = np.nan
                    cells.append((position[bad], key, reason))
        return self._named_cells(cells), clamped

    def _named_cells(self, cells: list[tuple[IntArray, str, str]]) -> list[Reject]:
        """What stands in each cell; those that a map calls missing are no rejects."""
        if not cells:
            return []
        keys = {self.layout.value_fields[key]: key for _, key, _ in cells}
        # Cells without a number may be a whole column of holes; the others are few.
        impossible = {
            (line, self.layout.value_fields[key]): reason
            for where, key, reason in cells
            if reason != _not_a_value(key)
            for line in (where + 1).tolist()
        }
        fields = [np.full(len(where), self.layout.value_fields[key]) for where, key, _ in cells]
        parameters = {
            "path": str(self.text.lines_path),
            "delimiter": self.layout.delimiter,
            "missing": list(self.columns.missing),
            "cell_line": (np.concatenate([where for where, *_ in cells]) + 1).tolist(),
            "cell_field": np.concatenate(fields).tolist(),
        }
        rows = self.con.execute(load_query("ingest/doubtful_cell").text, parameters).fetchall()
        named = self._lines(np.array([r[0] for r in rows], dtype=np.int64) - 1)
        rejects = []
        for line, (place, cell, text) in zip(named, rows, strict=True):
            reason = impossible.get((place, cell), _not_a_value(keys[cell]))
            rejects.append(Reject(int(line), keys[cell], reason, text))
        return rejects


def _doubtful_unit(rejects: list[Reject], rows: int) -> list[str]:
    """A word where most power factors are refused: a unit is wrong, not the meter."""
    above = sum(reject.reason == "a power factor above 1" for reject in rejects)
    if above * 2 <= rows:
        return []
    return [
        f"{above} power factors are above 1: if the meter prints percent, set "
        'pf_unit = "percent" in the column map and ingest again'
    ]


def _not_a_value(key: str) -> str:
    is_word = key.startswith("lead_lag_")
    return "no word for lagging or leading" if is_word else "not a finite number"


def _within_years(instant: IntArray) -> _BoolArray:
    """True from 1970 to 2099; `NOT_A_TIME` lies before."""
    return np.asarray((instant >= 0) & (instant < _LATEST))


def _integers(column: pa.ChunkedArray) -> IntArray:
    """Int64 with `NOT_A_TIME` for null."""
    return np.asarray(column.fill_null(timestamps.NOT_A_TIME).to_numpy())


def _floats(column: pa.ChunkedArray, chosen: IntArray, factor: float) -> FloatArray:
    """Chosen doubles with NaN for null, scaled, as an array of its own."""
    x = column.to_numpy()
    x = x[chosen] if len(chosen) < len(x) else np.array(x, dtype=np.float64)
    if factor != 1.0:
        x *= factor
    return np.asarray(x)


def _has_measurement(values: dict[str, FloatArray]) -> _BoolArray:
    """True where a row has any number; a word for lead or lag is none."""
    numbers = [x for key, x in values.items() if not key.startswith("lead_lag_")]
    found = ~np.isnan(numbers[0])
    for x in numbers[1:]:
        if found.all():
            break
        found |= ~np.isnan(x)
    return found
