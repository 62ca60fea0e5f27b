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
from meterlens.store.columns import NUMBER, STORE_COLUMN
from meterlens.store.export_rows import ExportRows, Reject
from meterlens.store.export_text import ExportText
from meterlens.store.layout import Layout
from meterlens.store.query_files import load_query
from meterlens.store.zones import IntArray

__all__ = ["RowJudge"]

_NO_TIME = "no usable time"
_FIELDS = "wrong number of fields"
_EMPTY = "no measurement at all"


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
    if not NUMBER.fullmatch(text):
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
