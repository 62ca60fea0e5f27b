-- How many intervals of one service carry each flag, and when first and last.
-- args: $service
-- row: one flag
with combination as (
    select
        flag_bits,
        count(*) as intervals,
        min(start_utc) as first_utc,
        max(start_utc + to_minutes(interval_min)) as last_utc
    from reading
    where service = $service
    group by flag_bits
),
flagged as (
    select
        unnest(flag_words(flag_bits)) as flag,
        intervals,
        first_utc,
        last_utc
    from combination
)
select
    flag,
    sum(intervals)::bigint as intervals,
    min(first_utc) as first_utc,
    max(last_utc) as last_utc
from flagged
group by flag
order by flag;
