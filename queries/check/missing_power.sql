-- Runs of intervals of one service that are there but have no total power.
-- args: $service
-- row: one run
with flagged as (
    select
        start_utc,
        interval_min,
        p_kw is null as without_power,
        lag(p_kw is null, 1, false) over (order by start_utc) as before_without,
        lag(start_utc + to_minutes(interval_min)) over (order by start_utc) as before_end_utc
    from reading
    where service = $service
),
numbered as (
    select
        *,
        sum((not before_without or before_end_utc <> start_utc)::integer) over (
            order by start_utc rows unbounded preceding
        ) as run
    from flagged
    where without_power
)
select
    min(start_utc) as start_utc,
    max(start_utc + to_minutes(interval_min)) as end_utc,
    count(*) as intervals
from numbered
group by run
order by start_utc;
