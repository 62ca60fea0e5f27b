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
)
select
    epoch_us(start_utc) as start_us,
    interval_min,
    file_id,
    line,
    given,
    v_a,
    v_b,
    v_c,
    v_ab,
    v_bc,
    v_ca,
    i_a,
    i_b,
    i_c,
    i_n_metered_a,
    pf_exported_a,
    pf_exported_b,
    pf_exported_c,
    pf_exported_total,
    lead_lag_a,
    lead_lag_b,
    lead_lag_c,
    lead_lag_total,
    p_metered_a_kw,
    p_metered_b_kw,
    p_metered_c_kw,
    q_metered_a_kvar,
    q_metered_b_kvar,
    q_metered_c_kvar,
    s_metered_a_kva,
    s_metered_b_kva,
    s_metered_c_kva,
    p_metered_kw,
    q_metered_kvar,
    s_metered_kva
from superseded_reading
where service = $service
    and start_utc in (select start_utc from contested)
union all
select
    epoch_us(start_utc) as start_us,
    interval_min,
    file_id,
    line,
    given,
    v_a,
    v_b,
    v_c,
    further[1] as v_ab,
    further[2] as v_bc,
    further[3] as v_ca,
    i_a,
    i_b,
    i_c,
    i_n_metered_a,
    pf_exported_a,
    pf_exported_b,
    pf_exported_c,
    further[4] as pf_exported_total,
    further[5] as lead_lag_a,
    further[6] as lead_lag_b,
    further[7] as lead_lag_c,
    further[8] as lead_lag_total,
    further[9] as p_metered_a_kw,
    further[10] as p_metered_b_kw,
    further[11] as p_metered_c_kw,
    further[12] as q_metered_a_kvar,
    further[13] as q_metered_b_kvar,
    further[14] as q_metered_c_kvar,
    further[15] as s_metered_a_kva,
    further[16] as s_metered_b_kva,
    further[17] as s_metered_c_kva,
    further[18] as p_metered_kw,
    further[19] as q_metered_kvar,
    further[20] as s_metered_kva
from reading
where service = $service
    and start_utc in (select start_utc from contested)
order by start_us, file_id, line;
