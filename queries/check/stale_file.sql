-- How many files of one service were read under each column map.
-- args: $service
-- row: one column map
select
    map_digest,
    count(*) as files
from ingested_file
where service = $service
group by map_digest
order by map_digest;
