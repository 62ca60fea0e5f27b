-- The first start and the last end of all readings.
-- args: none
-- row: the one span, null where there are no readings
select
    min(start_utc) as first_utc,
    max(start_utc + to_minutes(interval_min)) as last_utc
from reading;
