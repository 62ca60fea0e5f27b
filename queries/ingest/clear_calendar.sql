-- Take the calendar away, before it is written anew.
-- args: none
-- row: none
delete from calendar_month;
