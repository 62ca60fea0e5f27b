-- The longest unbroken run of each month in which a phase current of one service stays above a
-- share of its rating.
-- args: $service, $share
-- row: one month
with loaded as (
    select
        r.start_utc,
        r.interval_min,
        strftime(r.start_utc + to_minutes(r.utc_offset_min), '%Y-%m') as month,
        coalesce(greatest(r.i_a, r.i_b, r.i_c) > $share::double * s.rating_a, false) as over,
        lag(r.start_utc + to_minutes(r.interval_min)) over (order by r.start_utc)
            is distinct from r.start_utc as after_gap
    from reading as r
    join service_setting as s using (service)
    where r.service = $service
),
opened as (
    select
        *,
        over and (after_gap or not lag(over, 1, false) over (order by start_utc)) as opens
    from loaded
),
numbered as (
    select
        *,
        sum(opens::integer) over (order by start_utc rows unbounded preceding) as run
    from opened
),
run_of_intervals as (
    select
        min(month) as month,
        min(start_utc) as start_utc,
        max(start_utc + to_minutes(interval_min)) as end_utc,
        sum(interval_min)::bigint as minutes
    from numbered
    where over
    group by run
)
select *
from run_of_intervals
qualify row_number() over (partition by month order by minutes desc, start_utc) = 1
order by month;
