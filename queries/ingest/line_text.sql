-- The text of chosen lines of an export, for messages.
-- args: $path, $lines
-- row: one line
with numbered as (
    select
        row_number() over () as line,
        line as text
    from read_csv(
        $path,
        delim = '\x1d',
        quote = '',
        escape = '',
        header = false,
        auto_detect = false,
        max_line_size = 16777216,
        hive_partitioning = false,
        compression = 'none',
        columns = {'line': 'varchar'}
    )
)
select
    line,
    coalesce(text, '') as text
from numbered
where line in (select unnest($lines::bigint[]))
order by line;
