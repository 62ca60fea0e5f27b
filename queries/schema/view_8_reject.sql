-- Rows and values that could not be read, each with its line and reason.
-- args: none
-- row: one rejected row, or one rejected value where a column is named
create or replace view reject as
select
    f.path as file,
    f.service,
    r.line,
    r.column_name as column,
    r.reason,
    r.text,
    r.file_id
from rejected as r
join ingested_file as f using (file_id);
