-- The files of one service with the same bytes.
-- args: $service, $sha256
-- row: one file under one column map
select *
from ingested_file
where service = $service
    and sha256 = $sha256
order by file_id;
