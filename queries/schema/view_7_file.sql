-- The exports in the store: where each came from and what became of its rows.
-- args: none
-- row: one file under one column map
create or replace view file as
select
    file_id,
    service,
    path,
    size_bytes,
    sha256,
    map_digest,
    ingested_utc,
    interval_min,
    rows_read,
    rows_stored,
    rows_replaced,
    rows_duplicate,
    rows_rejected,
    values_rejected,
    values_clamped
from ingested_file;
