-- Every version, earlier and present, of the intervals that a file and another line both wrote.
-- args: $service, $file_id
-- row: one version of one interval in the order of its files and lines, the present one last
with contested as (
    select distinct start_utc
    from superseded_reading
    where service = $service
        and (file_id = $file_id or by_file_id = $file_id)
    union
    select start_utc
    from repeated_reading
    where service = $service
        and start_utc in (
            select start_utc
            from reading
            where service = $service
                and file_id = $file_id
        )
),
version as (
    select * exclude (by_file_id, by_line, replaced)
    from superseded_reading
    union all by name
    select *
    from reading_version
)
select
    epoch_us(start_utc) as start_us,
    * exclude (service, start_utc, utc_offset_min)
from version
where service = $service
    and start_utc in (select start_utc from contested)
order by start_us, file_id, line;
