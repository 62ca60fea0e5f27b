-- Rows that said again what was stored: with the file that said it first taken out, they
-- still stand. `given` has a bit for each value that the line had.
-- args: none
-- row: one duplicate row of another file than the one it repeats
create table if not exists repeated_reading (
    service varchar not null,
    start_utc timestamp not null,
    file_id integer not null,
    line integer not null,
    given bigint not null
);
