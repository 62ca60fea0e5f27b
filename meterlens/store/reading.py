"""One export's rows as arrays: stamps, numbers, and what could not be read."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import duckdb
import numpy as np
import numpy.typing as npt
import pyarrow as pa

from meterlens.electrical.conventions import PF_CLAMP_BOUND, FloatArray
from meterlens.errors import ExportError
from meterlens.settings import ColumnMap, Service
from meterlens.store import timestamps
from meterlens.store.columns import STORE_COLUMN
from meterlens.store.export_text import ExportText
from meterlens.store.layout import Layout, find_layout
from meterlens.store.query_files import load_query
from meterlens.store.zones import IntArray

__all__ = ["ExportRows", "Reject", "column_map_of", "read_rows"]

_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?")
_NO_TIME = "no usable time"
_FIELDS = "wrong number of fields"
_EMPTY = "no measurement at all"


@dataclass(frozen=True)
class Reject:
    """One row (no column) or one value that could not be read.

    Attributes
    ----------
    line : int
        1-based line of the export.
    column : str or None
        Key of the column map, where one value is at fault.
    reason, text : str
        Why, and what stands there.
    """

    line: int
    column: str | None
    reason: str
    text: str


@dataclass
class ExportRows:
    """The usable rows of one export, in the order of its lines.

    Attributes
    ----------
    text : ExportText
        The file and its fingerprint.
    interval_min : int
    rows_read : int
        Non-blank lines after the header and the units row.
    line, start_utc : IntArray
        Shape (n,): 1-based line; start in microseconds since 1970 UTC.
    values : dict of str to FloatArray
        Store column → numbers as printed, scaled; NaN where missing.
    row_rejects, value_rejects : list of Reject
    values_clamped : int
        Power factors up to half a percent above 1.
    notes : list of str
        What was found where the map left it open.
    """

    text: ExportText
    interval_min: int
    rows_read: int
    line: IntArray
    start_utc: IntArray
    values: dict[str, FloatArray]
    row_rejects: list[Reject] = field(default_factory=list)
    value_rejects: list[Reject] = field(default_factory=list)
    values_clamped: int = 0
    notes: list[str] = field(default_factory=list)


def read_rows(
    con: duckdb.DuckDBPyConnection, text: ExportText, service: Service, zone_name: str
) -> ExportRows:
    """Read one opened export by its service's column map.

    Parameters
    ----------
    con : DuckDBPyConnection
        Any connection; nothing is stored.
    text : ExportText
        The opened export.
    service : Service
        With its column map.
    zone_name : str
        IANA name of the site's zone.

    Returns
    -------
    ExportRows

    Raises
    ------
    ExportError
        The file cannot be read at all: a mapped column missing, a time format that reads
        no row, an interval length that cannot be told.
    """
    columns = column_map_of(service, text.file)
    layout = find_layout(text, columns)
    table = _printed_rows(con, text, layout, columns)
    return _Judge(con, text, layout, columns).rows(table, zone_name)


def column_map_of(service: Service, file: Path) -> ColumnMap:
    """The service's column map; an error where it has none."""
    if service.columns is None:
        raise ExportError(
            f'service "{service.id}" has no column map',
            file=file,
            hint="Add [service.columns] to site.toml.",
        )
    return service.columns


def _printed_rows(
    con: duckdb.DuckDBPyConnection, text: ExportText, layout: Layout, columns: ColumnMap
) -> pa.Table:
    for function in ("ingest/printed_number", "ingest/lead_lag_sense"):
        con.execute(load_query(function).text)
    formats = layout.time_formats
    numeric = [word for word in columns.missing if _NUMBER.fullmatch(word.strip())]
    parameters: dict[str, Any] = {key: layout.value_fields.get(key) for key in STORE_COLUMN}
    parameters |= {
        "path": str(text.lines_path),
        "delimiter": layout.delimiter,
        "time_field": layout.time_fields[0],
        "time_field_2": layout.time_fields[1] if len(layout.time_fields) > 1 else None,
        "time_format": list(formats),
        "is_epoch": formats == ("epoch",),
        "decimal_mark": layout.decimal,
        "grouped_pattern": layout.grouped_pattern,
        "thousands_mark": layout.thousands,
        "doubtful": text.has_underscore,
        "missing_number": numeric,
    }
    wanted = ["field_count", "printed_us", *layout.value_fields]
    try:
        relation = con.sql(load_query("ingest/printed_row").text, params=parameters)
        return relation.select(*map(duckdb.ColumnExpression, wanted)).to_arrow_table()
    except duckdb.Error as error:
        raise ExportError(
            f"cannot be read as lines of text ({_first_line(error)})", file=text.file
        ) from None


def _first_line(error: Exception) -> str:
    return str(error).strip().splitlines()[0]


class _Judge:
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
        self.notes: list[str] = []

    def rows(self, table: pa.Table, zone_name: str) -> ExportRows:
        """Usable rows of the converted lines."""
        table = table.slice(self.layout.first_line)
        position = np.arange(self.layout.first_line, self.layout.first_line + table.num_rows)
        counts = table["field_count"].to_numpy()
        # An empty line comes as null; one of blanks alone is looked at as text below.
        present = ~np.isnan(counts) if counts.dtype.kind == "f" else np.ones(len(counts), bool)
        printed = _integers(table["printed_us"])
        whole = present & (counts == self.layout.field_count)
        timed = printed != timestamps.NOT_A_TIME
        blank = self._reject_lines(position, present & ~(whole & timed), whole)
        if not (whole & timed).any():
            self._no_row_at_all(position, present & whole)
        keep = whole & timed
        interval = self._interval_min(printed[keep])
        stamps = timestamps.read_stamps(
            printed[keep], self.columns.clock, self.columns.stamp, zone_name, interval
        )
        self._reject_stamps(position[keep], stamps)
        usable = stamps.start_utc != timestamps.NOT_A_TIME
        chosen = np.flatnonzero(keep)[usable]
        values = {
            key: _floats(table[key], chosen, self.columns.scale.get(key, 1.0))
            for key in self.layout.value_fields
        }
        where = position[chosen]
        value_rejects, clamped = self._impossible_values(values, where)
        measured = _has_measurement(values)
        self._add_rejects(where[~measured], _EMPTY)
        kept: slice | npt.NDArray[np.bool_] = slice(None) if measured.all() else measured
        result = ExportRows(
            text=self.text,
            interval_min=interval,
            rows_read=int(np.count_nonzero(present)) - blank,
            line=self._lines(where[kept]),
            start_utc=stamps.start_utc[usable][kept],
            values={STORE_COLUMN[key]: x[kept] for key, x in values.items()},
            row_rejects=sorted(self.row_rejects, key=lambda r: r.line),
            value_rejects=value_rejects,
            values_clamped=clamped,
            notes=self.notes,
        )
        if self.columns.quality is not None:
            self.notes.append(
                f'the status column "{self.columns.quality}" is not used by this version: '
                "estimated readings are kept like any other"
            )
        if self.columns.encoding is None and self.text.encoding not in ("utf-8", "utf-8-sig"):
            self.notes.append(f"read as {self.text.encoding}")
        return result

    def _lines(self, position: IntArray) -> IntArray:
        """1-based line of the export of each record."""
        if self.text.line_numbers is not None:
            return self.text.line_numbers[position]
        return np.asarray(position + 1)

    def _texts(self, position: IntArray) -> list[str]:
        if len(position) == 0:
            return []
        query = load_query("ingest/line_text").text
        parameters = {"path": str(self.text.lines_path), "lines": (position + 1).tolist()}
        found = dict(self.con.execute(query, parameters).fetchall())
        shown = self.layout.delimiter if self.layout.delimiter != "\x1f" else "\x1f"
        visible = "; " if shown == "\x1f" else shown
        return [found.get(int(p) + 1, "").replace(shown, visible) for p in position]

    def _reject_lines(
        self, position: IntArray, bad: npt.NDArray[np.bool_], whole: npt.NDArray[np.bool_]
    ) -> int:
        """Reject lines without the right fields or a time; returns how many were blank."""
        blank = 0
        texts = self._texts(position[bad])
        lines = self._lines(position[bad])
        for line, text, has_fields in zip(lines, texts, whole[bad], strict=True):
            if not text.strip():
                blank += 1
                continue
            reason = _NO_TIME if has_fields else _FIELDS
            self.row_rejects.append(Reject(int(line), None, reason, text))
        return blank

    def _reject_stamps(self, position: IntArray, stamps: timestamps.StampReading) -> None:
        for code, reason in timestamps.OUTCOME_REASONS.items():
            self._add_rejects(position[stamps.fault == code], f"{_NO_TIME}: {reason}")

    def _add_rejects(self, position: IntArray, reason: str) -> None:
        for line, text in zip(self._lines(position), self._texts(position), strict=True):
            self.row_rejects.append(Reject(int(line), None, reason, text))

    def _no_row_at_all(self, position: IntArray, whole: npt.NDArray[np.bool_]) -> None:
        if not whole.any():
            raise ExportError(
                f"no row has the header's {self.layout.field_count} fields",
                file=self.text.file,
                line=int(self._lines(position[:1])[0]) if len(position) else None,
                hint="Check delimiter and header_row in the column map.",
            )
        first = position[whole][:1]
        fields = self._texts(first)[0].split(self.layout.delimiter)
        printed = " ".join(
            fields[i - 1].strip() for i in self.layout.time_fields if i <= len(fields)
        )
        expected = self.columns.timestamp_format or "ISO 8601"
        raise ExportError(
            f'"{printed}" is not a time of the form {expected}',
            file=self.text.file,
            line=int(self._lines(first)[0]),
            key="timestamp_format",
            hint="Set timestamp_format to what the file prints.",
        )

    def _interval_min(self, printed: IntArray) -> int:
        stated = self.columns.interval_min
        minutes = stated if stated is not None else timestamps.infer_interval_min(printed)
        if minutes is None:
            raise ExportError(
                "has one time only, so the interval cannot be told",
                file=self.text.file,
                key="interval_min",
                hint="Set interval_min in the column map.",
            )
        if minutes < 1 or minutes != round(minutes):
            raise ExportError(
                f"its rows stand {minutes:g} minutes apart; whole minutes are needed",
                file=self.text.file,
                key="interval_min",
                hint="Set interval_min in the column map.",
            )
        return round(minutes)

    def _impossible_values(
        self, values: dict[str, FloatArray], position: IntArray
    ) -> tuple[list[Reject], int]:
        """Blank what cannot be, and name each such cell."""
        unity = 100.0 if self.columns.pf_unit == "percent" else 1.0
        cells: list[tuple[IntArray, str]] = []
        clamped = 0
        for key, x in values.items():
            bad = ~np.isfinite(x)
            if key.startswith(("v_", "i_")):
                bad |= x < 0
            elif key.startswith("pf_"):
                size = np.abs(x)
                bad |= size > PF_CLAMP_BOUND * unity
                clamped += int(np.count_nonzero((size > unity) & ~bad))
            x[bad] = np.nan
            if bad.any():
                cells.append((position[bad], key))
        return self._named_cells(cells), clamped

    def _named_cells(self, cells: list[tuple[IntArray, str]]) -> list[Reject]:
        if not cells:
            return []
        by_field = {self.layout.value_fields[key]: key for _, key in cells}
        position = np.concatenate([p for p, _ in cells])
        fields = np.concatenate(
            [np.full(len(p), self.layout.value_fields[key]) for p, key in cells]
        )
        parameters = {
            "path": str(self.text.lines_path),
            "delimiter": self.layout.delimiter,
            "missing": list(self.columns.missing),
            "cell_line": (position + 1).tolist(),
            "cell_field": fields.tolist(),
        }
        rows = self.con.execute(load_query("ingest/doubtful_cell").text, parameters).fetchall()
        named = self._lines(np.array([r[0] for r in rows], dtype=np.int64) - 1)
        return [
            Reject(int(line), by_field[f], _why(by_field[f], text), text)
            for line, (_, f, text) in zip(named, rows, strict=True)
        ]


def _why(key: str, text: str) -> str:
    if key.startswith("lead_lag_"):
        return "no word for lagging or leading"
    if not _NUMBER.fullmatch(text):
        return "not a finite number"
    if key.startswith("pf_"):
        return "a power factor above 1"
    if text.startswith("-"):
        return "a negative voltage" if key.startswith("v_") else "a negative current"
    return "not a finite number"


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


def _has_measurement(values: dict[str, FloatArray]) -> npt.NDArray[np.bool_]:
    """True where a row has any number; a word for lead or lag is none."""
    numbers = [x for key, x in values.items() if not key.startswith("lead_lag_")]
    found = ~np.isnan(numbers[0])
    for x in numbers[1:]:
        if found.all():
            break
        found |= ~np.isnan(x)
    return found
