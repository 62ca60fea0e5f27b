-- Add one month to the site's calendar.
-- args: $month, $start_utc, $end_utc, $minutes
-- row: none
insert into calendar_month values ($month, $start_utc, $end_utc, $minutes);
