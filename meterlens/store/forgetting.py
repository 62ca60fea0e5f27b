"""Taking one file's readings out again, and restoring what it had written over.

Most rows of a file are its own alone and simply go. Where other lines wrote to the same
interval, its versions are folded anew without those of the file.
"""

from __future__ import annotations

import numpy as np

from meterlens.settings import Service
from meterlens.store import derivation
from meterlens.store.database import Store
from meterlens.store.merge import merge_rows
from meterlens.store.rows import Rows, Superseded, column_bits, given_bits
from meterlens.store.tables import stored_rows, superseded_table, written_rows
from meterlens.store.zones import ZoneTable

__all__ = ["remove_file"]


def remove_file(store: Store, service: Service, file_id: int, zone: ZoneTable) -> None:
    """Take one file's readings out of the store, within the caller's transaction.

    Parameters
    ----------
    store : Store
        Open for writing.
    service : Service
    file_id : int
        As in the view `file`.
    zone : ZoneTable
        Offsets of the site's clock over the readings.
    """
    versions = stored_rows(store, "ingest/contested_version", service=service.id, file_id=file_id)
    contested = np.unique(versions.start)
    if len(contested):
        for query in ("ingest/remove_reading_at", "ingest/remove_superseded_at"):
            written_rows(store, query, service.id, contested)
    store.run("ingest/remove_reading_of_file", service=service.id, file_id=file_id)
    if len(contested):
        _fold_anew(store, service, versions, file_id, zone)
    store.run("ingest/remove_rejected", file_id=file_id)
    store.run("ingest/remove_file", file_id=file_id)


def _fold_anew(
    store: Store, service: Service, versions: Rows, file_id: int, zone: ZoneTable
) -> None:
    """Let the remaining versions meet again, each with the values its own line gave."""
    left = versions.take(versions.file_id != file_id)
    if len(left.start) == 0:
        return
    bits = np.where(left.given < 0, given_bits(left), left.given)
    own = (bits & column_bits(left.names)) != 0
    left.values = np.where(own, left.values, np.nan)
    left.given[:] = -1
    merge = merge_rows(Rows.empty(), left)
    _keep(store, service, merge.superseded, zone)
    batches = derivation.derived_batches(merge.written, service, zone)
    store.con.register("derived_row", batches)
    try:
        store.run("ingest/add_reading")
    finally:
        store.con.unregister("derived_row")


def _keep(store: Store, service: Service, superseded: Superseded, zone: ZoneTable) -> None:
    if len(superseded.by_line) == 0:
        return
    store.con.register("superseded_row", superseded_table(superseded, service.id, zone))
    try:
        store.run("ingest/add_superseded")
    finally:
        store.con.unregister("superseded_row")
