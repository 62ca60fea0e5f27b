-- The yardstick: one statement that reads the same export with DuckDB's own typed reader,
-- computes the same columns in SQL and stores them. It rejects nothing, keeps no line
-- numbers, looks at no clock and cannot be run twice; it shows what the columns alone cost.
create table reading as
with printed as (
    select *
    from read_csv(
        $path,
        header = true,
        columns = {
            'time': 'timestamp',
            'v_a': 'double', 'v_b': 'double', 'v_c': 'double',
            'i_a': 'double', 'i_b': 'double', 'i_c': 'double',
            'pf_a': 'double', 'pf_b': 'double', 'pf_c': 'double'
        }
    )
),
phase as (
    select
        *,
        v_a * i_a as s_a, v_b * i_b as s_b, v_c * i_c as s_c,
        case when pf_a < 0 then 1 else -1 end as sense_a,
        case when pf_b < 0 then 1 else -1 end as sense_b,
        case when pf_c < 0 then 1 else -1 end as sense_c,
        greatest(i_a, i_b, i_c) >= 16 as loaded,
        i_a >= 16 as loaded_a, i_b >= 16 as loaded_b, i_c >= 16 as loaded_c
    from printed
),
power as (
    select
        *,
        s_a * abs(pf_a) as p_a, s_b * abs(pf_b) as p_b, s_c * abs(pf_c) as p_c,
        sense_a * s_a * sqrt((1 - abs(pf_a)) * (1 + abs(pf_a))) as q_a,
        sense_b * s_b * sqrt((1 - abs(pf_b)) * (1 + abs(pf_b))) as q_b,
        sense_c * s_c * sqrt((1 - abs(pf_c)) * (1 + abs(pf_c))) as q_c
    from phase
),
phasor as (
    select
        *,
        p_a + p_b + p_c as p, q_a + q_b + q_c as q, s_a + s_b + s_c as s_arithmetic,
        -- Currents: I·(P − jQ)/S, turned by the angle of the voltage.
        i_a * p_a / s_a as re_a, -i_a * q_a / s_a as im_a,
        i_b / s_b * (-0.5 * p_b - 0.8660254037844386 * q_b) as re_b,
        i_b / s_b * (0.5 * q_b - 0.8660254037844386 * p_b) as im_b,
        i_c / s_c * (-0.5 * p_c + 0.8660254037844386 * q_c) as re_c,
        i_c / s_c * (0.5 * q_c + 0.8660254037844386 * p_c) as im_c,
        sqrt(v_a * v_a + v_b * v_b + v_a * v_b) as v_ab,
        sqrt(v_b * v_b + v_c * v_c + v_b * v_c) as v_bc,
        sqrt(v_c * v_c + v_a * v_a + v_c * v_a) as v_ca,
        (v_a + v_b + v_c) / 3 as v_1,
        sqrt(v_a * v_a + v_b * v_b + v_c * v_c - v_a * v_b - v_b * v_c - v_c * v_a) / 3 as v_2,
        (i_a + i_b + i_c) / 3 as i_mean
    from power
),
sequence as (
    select
        *,
        sqrt((re_a + re_b + re_c) ** 2 + (im_a + im_b + im_c) ** 2) as i_n,
        (re_a - 0.5 * (re_b + re_c) - 0.8660254037844386 * (im_b - im_c)) / 3 as re_1,
        (im_a - 0.5 * (im_b + im_c) + 0.8660254037844386 * (re_b - re_c)) / 3 as im_1,
        (re_a - 0.5 * (re_b + re_c) + 0.8660254037844386 * (im_b - im_c)) / 3 as re_2,
        (im_a - 0.5 * (im_b + im_c) - 0.8660254037844386 * (re_b - re_c)) / 3 as im_2,
        sqrt(p * p + q * q) as s_vector,
        (v_ab + v_bc + v_ca) / 3 as v_line
    from phasor
),
total as (
    select
        *,
        re_1 * re_1 + im_1 * im_1 as i_1_square,
        sqrt(
            (i_a * i_a + i_b * i_b + i_c * i_c + i_n * i_n)
            * (3 * (v_a * v_a + v_b * v_b + v_c * v_c) + v_ab * v_ab + v_bc * v_bc + v_ca * v_ca)
            / 6
        ) as s_effective
    from sequence
)
select
    'main' as service, time as start_utc, 1::smallint as interval_min,
    0::smallint as utc_offset_min, 1::integer as file_id,
    0::integer as line,
    v_a, v_b, v_c, i_a, i_b, i_c,
    pf_a as pf_exported_a, pf_b as pf_exported_b, pf_c as pf_exported_c,
    p_a / 1000 as p_a_kw, p_b / 1000 as p_b_kw, p_c / 1000 as p_c_kw,
    q_a / 1000 as q_a_kvar, q_b / 1000 as q_b_kvar, q_c / 1000 as q_c_kvar,
    s_a / 1000 as s_a_kva, s_b / 1000 as s_b_kva, s_c / 1000 as s_c_kva,
    p / 1000 as p_kw, q / 1000 as q_kvar, s_vector / 1000 as s_vector_kva,
    s_arithmetic / 1000 as s_arithmetic_kva, s_effective / 1000 as s_effective_kva,
    case when loaded_a then p_a / s_a end::float as pf_a,
    case when loaded_b then p_b / s_b end::float as pf_b,
    case when loaded_c then p_c / s_c end::float as pf_c,
    case when loaded then p / s_vector end::float as pf_vector,
    case when loaded then p / s_arithmetic end::float as pf_arithmetic,
    case when loaded then p / s_effective end::float as pf_effective,
    case when loaded_a then v_a / i_a * p_a / s_a end::float as r_wye_a_ohm,
    case when loaded_b then v_b / i_b * p_b / s_b end::float as r_wye_b_ohm,
    case when loaded_c then v_c / i_c * p_c / s_c end::float as r_wye_c_ohm,
    case when loaded_a then v_a / i_a * q_a / s_a end::float as x_wye_a_ohm,
    case when loaded_b then v_b / i_b * q_b / s_b end::float as x_wye_b_ohm,
    case when loaded_c then v_c / i_c * q_c / s_c end::float as x_wye_c_ohm,
    case when loaded then 3 * v_1 * re_1 / i_1_square end::float as r_delta_ohm,
    case when loaded then -3 * v_1 * im_1 / i_1_square end::float as x_delta_ohm,
    case when loaded then v_2 / v_1 end::float as vuf,
    case when loaded then
        greatest(abs(v_ab - v_line), abs(v_bc - v_line), abs(v_ca - v_line)) / v_line
    end::float as lvur,
    case when loaded then greatest(abs(v_a - v_1), abs(v_b - v_1), abs(v_c - v_1)) / v_1
    end::float as pvur,
    case when loaded then sqrt((re_2 * re_2 + im_2 * im_2) / i_1_square) end::float as iuf2,
    case when loaded then i_n / 3 / sqrt(i_1_square) end::float as iuf0,
    case when loaded then
        greatest(abs(i_a - i_mean), abs(i_b - i_mean), abs(i_c - i_mean)) / i_mean
    end::float as current_unbalance,
    i_n::float as i_n_a,
    2::utinyint as angle_grade_code, 0::utinyint as current_angle_grade_code,
    case when loaded then 0 else 1 end::usmallint as flag_bits
from total
