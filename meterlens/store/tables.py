"""Rows between arrays and the store's tables."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyarrow as pa

from meterlens.store.columns import READING_COLUMNS
from meterlens.store.database import Store
from meterlens.store.query_files import load_query
from meterlens.store.rows import UNCONTESTED, Rows, Superseded
from meterlens.store.zones import IntArray, ZoneTable

__all__ = ["rows_from_table", "stored_rows", "superseded_table", "written_rows"]


def stored_rows(store: Store, query: str, **parameters: Any) -> Rows:
    """Rows of a statement that yields the columns of `ingest/stored_reading`."""
    relation = store.con.sql(load_query(query).text, params=parameters)
    return rows_from_table(relation.to_arrow_table())


def rows_from_table(table: pa.Table) -> Rows:
    """Arrow columns as rows; null is NaN, a null `given` is `UNCONTESTED`."""

    def whole(name: str) -> IntArray:
        return np.asarray(table[name].to_numpy(), dtype=np.int64)

    names = tuple(n for n in READING_COLUMNS if table[n].null_count < table.num_rows)
    values = np.empty((len(names), table.num_rows))
    for place, name in enumerate(names):
        values[place] = table[name].to_numpy()
    return Rows(
        start=whole("start_us"),
        interval_min=whole("interval_min"),
        file_id=whole("file_id"),
        line=whole("line"),
        given=np.asarray(table["given"].fill_null(UNCONTESTED).to_numpy(), dtype=np.int64),
        names=names,
        values=values,
    )


def superseded_table(superseded: Superseded, service_id: str, zone: ZoneTable) -> pa.Table:
    """Versions written over, as rows of `superseded_reading`."""
    rows = superseded.rows
    columns: dict[str, pa.Array] = {
        "service": pa.array([service_id] * len(rows.start)),
        "start_utc": pa.array(rows.start.astype("datetime64[us]")),
        "interval_min": pa.array(rows.interval_min.astype(np.int16)),
        "utc_offset_min": pa.array(zone.offset_at(rows.start).astype(np.int16)),
        "file_id": pa.array(rows.file_id.astype(np.int32)),
        "line": pa.array(rows.line.astype(np.int32)),
        "given": pa.array(rows.given, mask=rows.given == UNCONTESTED),
        "by_file_id": pa.array(superseded.by_file_id.astype(np.int32)),
        "by_line": pa.array(superseded.by_line.astype(np.int32)),
        "replaced": pa.array(superseded.replaced),
    }
    for name, x in zip(rows.names, rows.values, strict=True):
        columns[name] = pa.array(x, mask=np.isnan(x))
    return pa.table(columns)


def written_rows(store: Store, query: str, service_id: str, starts: IntArray) -> None:
    """Run a statement over the starts handed to it as `start_to_remove`."""
    table = pa.table({"start_utc": pa.array(starts.astype("datetime64[us]"))})
    store.con.register("start_to_remove", table)
    try:
        store.run(query, service=service_id)
    finally:
        store.con.unregister("start_to_remove")
