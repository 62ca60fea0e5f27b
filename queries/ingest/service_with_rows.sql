-- The services that an export was read for.
-- args: none
-- row: one service
select distinct service
from ingested_file
order by service;
