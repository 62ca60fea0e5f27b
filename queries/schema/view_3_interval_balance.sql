-- Imbalance of voltages and currents, and the neutral current.
-- args: none
-- row: one interval of one service
create or replace view interval_balance as
select
    service,
    start_utc,
    start_utc + to_minutes(utc_offset_min) as start_local,
    interval_min,
    vuf,
    lvur,
    pvur,
    iuf2,
    iuf0,
    current_unbalance,
    i_n_a,
    i_n_metered_a,
    angle_grade_word(angle_grade_code) as angle_grade,
    current_angle_grade_word(current_angle_grade_code) as current_angle_grade,
    flag_words(flag_bits) as flags
from reading;
