"""Writing rows into the store's tables, within the caller's transaction."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pyarrow as pa

from meterlens.settings import Service
from meterlens.store import derivation
from meterlens.store.database import Store
from meterlens.store.export_rows import Reject
from meterlens.store.merge import Merge
from meterlens.store.rows import Rows, Superseded, given_bits
from meterlens.store.tables import superseded_table, written_rows
from meterlens.store.zones import zone_over

__all__ = ["keep_rejects", "write_derived", "write_merge"]


def write_merge(store: Store, service: Service, merge: Merge) -> None:
    """Write what became of rows that met the store."""
    _keep_superseded(store, service, merge.superseded)
    if len(merge.rewritten_start):
        written_rows(store, "ingest/remove_reading_at", service.id, merge.rewritten_start)
    if len(merge.written.start):
        write_derived(store, service, merge.written)
    if len(merge.repeated.start):
        _keep_repeated(store, service, merge.repeated)


def write_derived(store: Store, service: Service, rows: Rows) -> None:
    """Derive rows of one service, in order of start, and write them."""
    zone = zone_over(store.site.timezone, rows.start)
    _hand_over(
        store, "ingest/add_reading", "derived_row", derivation.derived_batches(rows, service, zone)
    )


def keep_rejects(store: Store, file_id: int, rejects: Sequence[Reject]) -> None:
    """Keep what could not be read of one file."""
    if not rejects:
        return
    table = pa.table(
        {
            "file_id": pa.array([file_id] * len(rejects), pa.int32()),
            "line": pa.array([r.line for r in rejects], pa.int32()),
            "column_name": pa.array([r.column for r in rejects], pa.string()),
            "reason": pa.array([r.reason for r in rejects], pa.string()),
            "text": pa.array([r.text for r in rejects], pa.string()),
        }
    )
    _hand_over(store, "ingest/add_rejected", "rejected_row", table)


def _keep_superseded(store: Store, service: Service, superseded: Superseded) -> None:
    if len(superseded.by_line) == 0:
        return
    zone = zone_over(store.site.timezone, superseded.rows.start)
    table = superseded_table(superseded, service.id, zone)
    _hand_over(store, "ingest/add_superseded", "superseded_row", table)


def _keep_repeated(store: Store, service: Service, repeated: Rows) -> None:
    table = pa.table(
        {
            "service": pa.array([service.id] * len(repeated.start)),
            "start_utc": pa.array(repeated.start.astype("datetime64[us]")),
            "file_id": pa.array(repeated.file_id.astype(np.int32)),
            "line": pa.array(repeated.line.astype(np.int32)),
            "given": pa.array(given_bits(repeated)),
        }
    )
    _hand_over(store, "ingest/add_repeated", "repeated_row", table)


def _hand_over(store: Store, query: str, name: str, rows: pa.Table | pa.RecordBatchReader) -> None:
    """Run a statement that reads rows under an agreed name."""
    store.con.register(name, rows)
    try:
        store.run(query)
    finally:
        store.con.unregister(name)
