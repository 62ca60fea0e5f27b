-- The number of the next file.
-- args: none
-- row: the one number
select coalesce(max(file_id), 0) + 1 as file_id
from (
    select file_id from ingested_file
    union all
    select by_file_id from superseded_reading
);
