-- The periods of one service, by kind and month of their start.
-- args: $service, $kind, $month
-- row: one period; all kinds where $kind is null, all months where $month is null
select *
from period
where service = $service
    and ($kind::varchar is null or kind = $kind)
    and ($month::varchar is null or strftime(start_local, '%Y-%m') = $month)
order by start_utc, kind;
