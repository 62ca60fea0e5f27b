-- Where the record of one service has no interval.
-- args: $service
-- row: one gap
with following as (
    select
        start_utc + to_minutes(interval_min) as gap_start_utc,
        lead(start_utc) over (order by start_utc) as gap_end_utc,
        interval_min
    from reading
    where service = $service
)
select
    gap_start_utc as start_utc,
    gap_end_utc as end_utc,
    -- Rounded up: a hole shorter than an interval still is one.
    ((epoch_us(gap_end_utc) - epoch_us(gap_start_utc) + interval_min * 60000000::bigint - 1)
        // (interval_min * 60000000::bigint))::bigint as missing_intervals
from following
where gap_end_utc > gap_start_utc
order by start_utc;
