-- The files of one service with their row outcomes.
-- args: $service
-- row: one file
select *
from file
where service = $service
order by file_id;
