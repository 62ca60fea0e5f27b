-- The text of the cells that gave no usable number, without those that a map calls missing.
-- args: $path, $delimiter, $missing, $cell_line, $cell_field
-- row: one cell
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
),
cell as (
    select
        unnest($cell_line::bigint[]) as line,
        unnest($cell_field::integer[]) as field
)
select
    cell.line,
    cell.field,
    trim(string_split(numbered.text, $delimiter)[cell.field]) as text
from cell
join numbered using (line)
where not list_contains($missing::varchar[], trim(string_split(numbered.text, $delimiter)[cell.field]))
    and trim(string_split(numbered.text, $delimiter)[cell.field]) <> ''
order by cell.line, cell.field;
