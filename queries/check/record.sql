-- The extent of one service's record and how much of it has a total power.
-- args: $service
-- row: the one record
select
    count(*) as intervals,
    min(start_utc) as first_utc,
    max(start_utc + to_minutes(interval_min)) as last_utc,
    mode(interval_min) as interval_min,
    count(distinct interval_min) as interval_lengths,
    sum(case when p_kw is not null then interval_min else 0 end) as minutes_with_p,
    sum(interval_min) as minutes_present
from reading
where service = $service;
