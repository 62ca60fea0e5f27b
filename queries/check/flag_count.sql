-- How many intervals of one service carry each flag, and when first and last.
-- args: $service
-- row: one flag
with flagged as (
    select
        unnest(flag_words(flag_bits)) as flag,
        start_utc,
        start_utc + to_minutes(interval_min) as end_utc
    from reading
    where service = $service
)
select
    flag,
    count(*) as intervals,
    min(start_utc) as first_utc,
    max(end_utc) as last_utc
from flagged
group by flag
order by flag;
