"""Taking one file's readings out again, and restoring what it had written over.

Most rows of a file are its own alone and simply go. Where other lines wrote to the same
interval, or said the same again, its versions are folded anew without those of the file.
"""

from __future__ import annotations

import numpy as np

from meterlens.settings import Service
from meterlens.store.database import Store
from meterlens.store.merge import merge_rows
from meterlens.store.rows import UNCONTESTED, Rows, column_bits, given_bits
from meterlens.store.tables import stored_rows, written_rows
from meterlens.store.writing import write_merge

__all__ = ["remove_file"]


def remove_file(store: Store, service: Service, file_id: int) -> None:
    """Take one file's readings out of the store, within the caller's transaction.

    Parameters
    ----------
    store : Store
        Open for writing.
    service : Service
    file_id : int
        As in the view `file`.
    """
    keys = {"service": service.id, "file_id": file_id}
    versions = stored_rows(store, "ingest/contested_version", **keys)
    repeats = store.rows("ingest/contested_repeat", **keys)
    contested = np.unique(versions.start)
    if len(contested):
        for table in ("reading", "superseded", "repeated"):
            written_rows(store, f"ingest/remove_{table}_at", service.id, contested)
    store.run("ingest/remove_reading_of_file", **keys)
    left = _own_values(versions, [tuple(row.values()) for row in repeats])
    left = left.take(left.file_id != file_id)
    if len(left.start):
        write_merge(store, service, merge_rows(Rows.empty(), left))
    for table in ("rejected", "repeated", "file"):
        store.run(f"ingest/remove_{table}", file_id=file_id)


def _own_values(versions: Rows, repeats: list[tuple[int, int, int, int]]) -> Rows:
    """Every version and repeat with the values that its own line gave, oldest first.

    A repeat had what stood in the store when it came: the values of the last version
    before it.
    """
    bits = np.where(versions.given == UNCONTESTED, given_bits(versions), versions.given)
    keys = list(
        zip(versions.start.tolist(), versions.file_id.tolist(), versions.line.tolist(), strict=True)
    )
    source, given = list(range(len(keys))), bits.tolist()
    file_id, line = versions.file_id.tolist(), versions.line.tolist()
    place = 0
    for start, repeating, at_line, had in repeats:
        while place + 1 < len(keys) and keys[place + 1] < (start, repeating, at_line):
            place += 1
        source.append(place)
        given.append(had)
        file_id.append(repeating)
        line.append(at_line)
    rows = versions.take(np.array(source, dtype=np.int64))
    rows.file_id, rows.line = np.array(file_id, dtype=np.int64), np.array(line, dtype=np.int64)
    own = (np.array(given, dtype=np.int64) & column_bits(rows.names)) != 0
    rows.values = np.where(own, rows.values, np.nan)
    rows.given = np.full(len(source), UNCONTESTED, dtype=np.int64)
    return rows.take(np.lexsort((rows.line, rows.file_id, rows.start)))
