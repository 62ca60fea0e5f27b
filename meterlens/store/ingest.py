"""Reading exports into the store: repeatable, and all or nothing for each file."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np

from meterlens.settings import Service, map_digest
from meterlens.store.columns import READING_COLUMNS
from meterlens.store.database import Store, stale_services, write_settings
from meterlens.store.export_rows import ExportRows, Reject
from meterlens.store.export_text import opened_export
from meterlens.store.forgetting import remove_file
from meterlens.store.interval_length import LONGEST_INTERVAL_MIN
from meterlens.store.merge import Merge, Outcome, merge_rows
from meterlens.store.reading import column_map_of, read_rows
from meterlens.store.rows import UNCONTESTED, Rows
from meterlens.store.tables import stored_rows
from meterlens.store.writing import keep_rejects, write_derived, write_merge
from meterlens.store.zones import MICROSECONDS_PER_MINUTE

__all__ = ["FileOutcome", "ingest_file", "rederive", "refresh"]


@dataclass
class FileOutcome:
    """What became of one file; the counts are those of `interface`'s row outcomes."""

    file: str
    service: str
    rows_read: int
    rows_stored: int
    rows_replaced: int
    rows_duplicate: int
    rows_rejected: int
    values_rejected: int
    values_clamped: int
    rejects: list[Reject]
    notes: list[str] = field(default_factory=list)


def ingest_file(store: Store, file: Path, service: Service) -> FileOutcome:
    """Read one export into the store.

    Parameters
    ----------
    store : Store
        Open for writing.
    file : Path
    service : Service
        Whose column map reads the file.

    Returns
    -------
    FileOutcome
        Its four row counts add up to the rows read.

    Raises
    ------
    ExportError
        The file cannot be read at all; the store is as it was.

    Notes
    -----
    A file known by its bytes and its map is not read again. The same bytes under another
    map take the place of the earlier ingest.
    """
    site = store.site
    digest = map_digest(site, service)
    with opened_export(file, column_map_of(service, file).encoding) as text:
        known = store.rows("ingest/known_file", service=service.id, sha256=text.sha256)
        same = next((row for row in known if row["map_digest"] == digest), None)
        if same is not None:
            return _known_outcome(store, file, same)
        rows = read_rows(store.con, text, service, site.timezone)
    with store.transaction():
        notes = list(rows.notes)
        for earlier in known:
            remove_file(store, service, int(earlier["file_id"]))
            notes.append("the column map changed: the file's earlier readings were taken out")
        outcome = _store_rows(store, file, service, rows, digest)
        write_settings(store)
    outcome.notes = notes
    return outcome


def _known_outcome(store: Store, file: Path, record: dict[str, Any]) -> FileOutcome:
    """Every good row of a known file is a duplicate, and its rejects are not kept twice."""
    rejected = store.rows("ingest/rejected_of_file", file_id=record["file_id"])
    return FileOutcome(
        file=str(file),
        service=record["service"],
        rows_read=record["rows_read"],
        rows_stored=0,
        rows_replaced=0,
        rows_duplicate=record["rows_read"] - record["rows_rejected"],
        rows_rejected=record["rows_rejected"],
        values_rejected=record["values_rejected"],
        values_clamped=record["values_clamped"],
        rejects=[Reject(**row) for row in rejected],
        notes=["the same file under the same column map is in the store already"],
    )


def _store_rows(
    store: Store, file: Path, service: Service, rows: ExportRows, digest: str
) -> FileOutcome:
    file_id = int(store.rows("ingest/next_file_id")[0]["file_id"])
    incoming = _incoming(rows, file_id)
    merge = merge_rows(_stored_near(store, service, incoming), incoming)
    write_merge(store, service, merge)
    rejects = rows.row_rejects + _overlap_rejects(rows, merge)
    rejects.sort(key=lambda reject: reject.line)
    counts = np.bincount(merge.outcome, minlength=len(Outcome)).tolist()
    outcome = FileOutcome(
        file=str(file),
        service=service.id,
        rows_read=rows.rows_read,
        rows_stored=counts[Outcome.STORED],
        rows_replaced=counts[Outcome.REPLACED],
        rows_duplicate=counts[Outcome.DUPLICATE],
        rows_rejected=len(rejects),
        values_rejected=len(rows.value_rejects),
        values_clamped=rows.values_clamped,
        rejects=sorted(rejects + rows.value_rejects, key=lambda r: (r.line, r.column or "")),
    )
    keep_rejects(store, file_id, outcome.rejects)
    store.run(
        "ingest/add_file",
        file_id=file_id,
        service=service.id,
        path=str(file),
        size_bytes=rows.text.size_bytes,
        sha256=rows.text.sha256,
        map_digest=digest,
        ingested_utc=datetime.now(UTC).replace(tzinfo=None, microsecond=0),
        interval_min=rows.interval_min,
        rows_read=outcome.rows_read,
        rows_stored=outcome.rows_stored,
        rows_replaced=outcome.rows_replaced,
        rows_duplicate=outcome.rows_duplicate,
        rows_rejected=outcome.rows_rejected,
        values_rejected=outcome.values_rejected,
        values_clamped=outcome.values_clamped,
    )
    return outcome


def _incoming(rows: ExportRows, file_id: int) -> Rows:
    count = len(rows.start_utc)
    names = tuple(name for name in READING_COLUMNS if name in rows.values)
    values = np.array([rows.values[name] for name in names])
    return Rows(
        start=rows.start_utc,
        interval_min=np.full(count, rows.interval_min, dtype=np.int64),
        file_id=np.full(count, file_id, dtype=np.int64),
        line=rows.line,
        given=np.full(count, UNCONTESTED, dtype=np.int64),
        names=names,
        values=values,
    )


def _stored_near(store: Store, service: Service, incoming: Rows) -> Rows:
    if len(incoming.start) == 0:
        return Rows.empty()
    reach = LONGEST_INTERVAL_MIN * MICROSECONDS_PER_MINUTE
    return stored_rows(
        store,
        "ingest/stored_reading",
        service=service.id,
        from_utc=int(incoming.start.min()) - reach,
        until_utc=int(incoming.start.max()) + reach,
    )


def _overlap_rejects(rows: ExportRows, merge: Merge) -> list[Reject]:
    where = np.flatnonzero(merge.outcome == Outcome.REJECTED)
    stamps = rows.start_utc[where].astype("datetime64[us]").astype("datetime64[m]")
    return [
        Reject(
            int(rows.line[place]),
            None,
            "lies over another interval in the store or earlier in the file",
            f"start {stamp} UTC, {rows.interval_min} min",
        )
        for place, stamp in zip(where, stamps, strict=True)
    ]


def rederive(store: Store, service: Service) -> int:
    """Derive all rows of one service anew; returns how many."""
    rows = stored_rows(
        store,
        "ingest/stored_reading",
        service=service.id,
        from_utc=-(2**53),
        until_utc=2**53,
    )
    store.run("ingest/remove_reading_of_service", service=service.id)
    if len(rows.start):
        write_derived(store, service, rows)
    return len(rows.start)


def refresh(store: Store) -> list[str]:
    """Bring settings and stale derived rows up to date; returns what was derived anew.

    Parameters
    ----------
    store : Store
        Open for writing.
    """
    stale = stale_services(store)
    with store.transaction():
        for service_id in stale:
            rederive(store, store.site.service(service_id))
        write_settings(store)
    return stale
