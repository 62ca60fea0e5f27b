-- What could not be read of one file, in order of line.
-- args: $file_id
-- row: one row or value
select
    line,
    column_name as column,
    reason,
    text
from rejected
where file_id = $file_id
order by line, column_name nulls first;
