-- The calendar months of the site, with their true length over clock changes.
-- args: none
-- row: one month
create table if not exists calendar_month (
    month varchar not null,
    start_utc timestamp not null,
    end_utc timestamp not null,
    minutes integer not null
);
