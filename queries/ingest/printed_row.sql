-- Every line of an export in file order, split and converted: how many fields it has, its
-- printed stamp as microseconds, and the numbers of the mapped columns. A time of 24:00 is
-- midnight at the day's end. Formats that read an offset know no Z, and
-- where the clock is UTC a stamp may say so.
-- args: $path, $delimiter, $time_field, $time_field_2, $time_format, $offset_rule, $is_epoch, $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number, $v_a, $v_b, $v_c, $v_ab, $v_bc, $v_ca, $i_a, $i_b, $i_c, $i_n, $pf_a, $pf_b, $pf_c, $pf_total, $lead_lag_a, $lead_lag_b, $lead_lag_c, $lead_lag_total, $p_a_kw, $p_b_kw, $p_c_kw, $q_a_kvar, $q_b_kvar, $q_c_kvar, $s_a_kva, $s_b_kva, $s_c_kva, $p_kw, $q_kvar, $s_kva
-- row: one line of the file
with line_of_file as (
    select string_split(line, $delimiter) as field
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
stamped as (
    select
        field,
        case
            when $time_field_2::integer is null then trim(field[$time_field::integer])
            else trim(field[$time_field::integer]) || ' ' || trim(field[$time_field_2::integer])
        end as printed_stamp
    from line_of_file
),
timed as (
    select
        field,
        case
            when $offset_rule::varchar = 'read'
                then regexp_replace(printed_stamp, '[Zz]$', '+00:00')
            when $offset_rule::varchar = 'none-but-utc'
                and (
                    suffix(printed_stamp, 'Z')
                    or suffix(printed_stamp, 'z')
                    or suffix(printed_stamp, '00:00')
                    or suffix(printed_stamp, '0000')
                )
                then regexp_replace(printed_stamp, '([Zz]|[+-]00:?00)$', '')
            else printed_stamp
        end as stamp
    from stamped
)
select
    len(field)::integer as field_count,
    case
        when $is_epoch then try_cast(try_cast(stamp as double) * 1e6::double as bigint)
        else epoch_us(
            coalesce(
                try_strptime(stamp, $time_format),
                case
                    when contains(stamp, '24:00')
                        then try_strptime(replace(stamp, '24:00', '00:00'), $time_format)
                            + interval 1 day
                end
            )
        )
    end as printed_us,
    printed_number(field[$v_a::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as v_a,
    printed_number(field[$v_b::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as v_b,
    printed_number(field[$v_c::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as v_c,
    printed_number(field[$v_ab::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as v_ab,
    printed_number(field[$v_bc::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as v_bc,
    printed_number(field[$v_ca::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as v_ca,
    printed_number(field[$i_a::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as i_a,
    printed_number(field[$i_b::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as i_b,
    printed_number(field[$i_c::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as i_c,
    printed_number(field[$i_n::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as i_n,
    printed_number(field[$pf_a::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as pf_a,
    printed_number(field[$pf_b::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as pf_b,
    printed_number(field[$pf_c::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as pf_c,
    printed_number(field[$pf_total::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as pf_total,
    lead_lag_sense(field[$lead_lag_a::integer]) as lead_lag_a,
    lead_lag_sense(field[$lead_lag_b::integer]) as lead_lag_b,
    lead_lag_sense(field[$lead_lag_c::integer]) as lead_lag_c,
    lead_lag_sense(field[$lead_lag_total::integer]) as lead_lag_total,
    printed_number(field[$p_a_kw::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as p_a_kw,
    printed_number(field[$p_b_kw::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as p_b_kw,
    printed_number(field[$p_c_kw::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as p_c_kw,
    printed_number(field[$q_a_kvar::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as q_a_kvar,
    printed_number(field[$q_b_kvar::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as q_b_kvar,
    printed_number(field[$q_c_kvar::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as q_c_kvar,
    printed_number(field[$s_a_kva::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as s_a_kva,
    printed_number(field[$s_b_kva::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as s_b_kva,
    printed_number(field[$s_c_kva::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as s_c_kva,
    printed_number(field[$p_kw::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as p_kw,
    printed_number(field[$q_kvar::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as q_kvar,
    printed_number(field[$s_kva::integer], $decimal_mark, $grouped_pattern, $thousands_mark, $doubtful, $missing_number) as s_kva
from timed;
