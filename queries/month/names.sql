-- The calendar months in site time that have readings.
-- args: none
-- row: one month
select distinct strftime(start_utc + to_minutes(utc_offset_min), '%Y-%m') as month
from reading
order by month;
