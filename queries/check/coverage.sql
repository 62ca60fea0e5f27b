-- How much of each local day of one service has a total power.
-- args: $service
-- row: one day
select
    (start_utc + to_minutes(utc_offset_min))::date as day,
    sum(interval_min) as minutes_present,
    sum(case when p_kw is not null then interval_min else 0 end) as minutes_with_p
from reading
where service = $service
group by day
order by day;
