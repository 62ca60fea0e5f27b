-- The repeats, by other files, of the intervals that a file wrote.
-- args: $service, $file_id
-- row: one repeat of one interval
select
    epoch_us(start_utc) as start_us,
    file_id,
    line,
    given
from repeated_reading
where service = $service
    and file_id <> $file_id
    and start_utc in (
        select start_utc
        from reading
        where service = $service
            and file_id = $file_id
        union all
        select start_utc
        from superseded_reading
        where service = $service
            and (file_id = $file_id or by_file_id = $file_id)
    )
order by start_us, file_id, line;
