-- Readings in UTC with the site's local time; numbers as the export printed them.
-- args: none
-- row: one interval of one service
create or replace view interval as
select
    service,
    start_utc,
    start_utc + to_minutes(utc_offset_min) as start_local,
    * exclude (service, start_utc, file_id, line, given),
    file_id,
    line
from reading_version;
