-- The stored rows of one service that a file may touch.
-- args: $service, $from_utc, $until_utc
-- row: one interval
select
    epoch_us(start_utc) as start_us,
    * exclude (service, start_utc, utc_offset_min)
from reading_version
where service = $service
    and start_utc > make_timestamp($from_utc::bigint)
    and start_utc < make_timestamp($until_utc::bigint)
order by start_utc;
