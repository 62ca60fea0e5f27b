-- A printed number as a double, or null where it is none. A thousands mark must group digits
-- by three; a mark that is neither decimal nor thousands makes the text no number.
-- args: none
-- row: none (a function)
create or replace temp macro printed_number(
    printed, decimal_mark, grouped_pattern, thousands_mark, doubtful, missing_number
) as
case
    when len(missing_number::varchar[]) > 0 and list_contains(missing_number::varchar[], trim(printed::varchar)) then null
    when doubtful and contains(printed::varchar, '_') then null
    when grouped_pattern is not null and contains(printed::varchar, thousands_mark::varchar)
        then case
            when regexp_full_match(trim(printed::varchar), grouped_pattern::varchar)
                then try_cast(
                    replace(replace(printed::varchar, thousands_mark::varchar, ''), decimal_mark, '.') as double
                )
        end
    when decimal_mark = '.' then try_cast(printed as double)
    when contains(printed::varchar, '.') then null
    else try_cast(replace(printed::varchar, ',', '.') as double)
end;
