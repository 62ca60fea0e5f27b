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
from reading
where service = $service
    and start_utc > make_timestamp($from_utc::bigint)
    and start_utc < make_timestamp($until_utc::bigint)
order by start_utc;
