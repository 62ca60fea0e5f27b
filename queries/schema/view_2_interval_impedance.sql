-- Equivalent impedances at the terminals: wye per phase and the balanced delta.
-- args: none
-- row: one interval of one service
create or replace view interval_impedance as
select
    service,
    start_utc,
    start_utc + to_minutes(utc_offset_min) as start_local,
    interval_min,
    r_wye_a_ohm,
    x_wye_a_ohm,
    r_wye_b_ohm,
    x_wye_b_ohm,
    r_wye_c_ohm,
    x_wye_c_ohm,
    -- Unequal delta elements belong to three-wire services; a four-wire one shows none.
    null::float as r_delta_ab_ohm,
    null::float as x_delta_ab_ohm,
    null::float as r_delta_bc_ohm,
    null::float as x_delta_bc_ohm,
    null::float as r_delta_ca_ohm,
    null::float as x_delta_ca_ohm,
    r_delta_ohm,
    x_delta_ohm,
    angle_grade_word(angle_grade_code) as angle_grade,
    current_angle_grade_word(current_angle_grade_code) as current_angle_grade,
    flag_words(flag_bits) as flags
from reading;
