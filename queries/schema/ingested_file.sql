-- Every export read into the store, with its row outcomes.
-- args: none
-- row: one file under one column map
create table if not exists ingested_file (
    file_id integer not null,
    service varchar not null,
    path varchar not null,
    size_bytes bigint not null,
    sha256 varchar not null,
    map_digest varchar not null,
    ingested_utc timestamp not null,
    interval_min smallint not null,
    rows_read bigint not null,
    rows_stored bigint not null,
    rows_replaced bigint not null,
    rows_duplicate bigint not null,
    rows_rejected bigint not null,
    values_rejected bigint not null,
    values_clamped bigint not null
);
