-- The stored rows of one service that a file may touch.
-- args: $service, $from_utc, $until_utc
-- row: one interval
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
    and start_utc > make_timestamp($from_utc::bigint)
    and start_utc < make_timestamp($until_utc::bigint)
order by start_utc;
