-- Active, reactive and apparent power and power factor, per phase and in total.
-- args: none
-- row: one interval of one service
create or replace view interval_power as
select
    service,
    start_utc,
    start_utc + to_minutes(utc_offset_min) as start_local,
    interval_min,
    p_a_kw,
    p_b_kw,
    p_c_kw,
    q_a_kvar,
    q_b_kvar,
    q_c_kvar,
    s_a_kva,
    s_b_kva,
    s_c_kva,
    pf_a,
    pf_b,
    pf_c,
    p_kw,
    q_kvar,
    s_vector_kva,
    s_arithmetic_kva,
    s_effective_kva,
    pf_vector,
    pf_arithmetic,
    pf_effective,
    angle_grade_word(angle_grade_code) as angle_grade,
    current_angle_grade_word(current_angle_grade_code) as current_angle_grade,
    flag_words(flag_bits) as flags
from reading;
