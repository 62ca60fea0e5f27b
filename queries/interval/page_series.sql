-- The record of one service as its page draws it.
-- args: $service
-- row: one interval
select
    start_utc,
    start_utc + to_minutes(utc_offset_min) as start_local,
    interval_min,
    v_a,
    v_b,
    v_c,
    i_a,
    i_b,
    i_c,
    i_n_a,
    p_kw,
    q_kvar,
    s_vector_kva,
    pf_vector,
    r_wye_a_ohm,
    r_wye_b_ohm,
    r_wye_c_ohm,
    x_wye_a_ohm,
    x_wye_b_ohm,
    x_wye_c_ohm,
    r_delta_ohm,
    x_delta_ohm,
    vuf,
    lvur,
    current_unbalance
from reading
where service = $service
order by start_utc;
