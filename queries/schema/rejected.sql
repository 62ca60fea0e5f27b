-- What could not be read, and why.
-- args: none
-- row: one rejected row (no column) or one rejected value of one line
create table if not exists rejected (
    file_id integer not null,
    line integer not null,
    column_name varchar,
    reason varchar not null,
    text varchar
);
