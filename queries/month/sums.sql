-- Sums and extremes of the months of one service.
-- args: $service, $month
-- row: one month, all of them where $month is null
select *
from month
where service = $service
    and ($month::varchar is null or month = $month)
order by month;
