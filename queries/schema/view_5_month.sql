-- Sums and extremes of every calendar month in site time. Energies are in kWh, kvarh and kVAh;
-- ratios that need a root (power factors, kVA of a window) are worked out from them elsewhere.
-- args: none
-- row: one month of one service
create or replace view month as
with interval_of_month as (
    select
        r.*,
        strftime(r.start_utc + to_minutes(r.utc_offset_min), '%Y-%m') as month,
        r.interval_min / 60.0::double as hours,
        s.tangent_target,
        s.target_pf,
        s.nominal_line_to_neutral_v,
        s.voltage_low_pu,
        s.voltage_high_pu,
        s.rating_a,
        case s.billing_kva
            when 'vector' then r.s_vector_kva
            when 'arithmetic' then r.s_arithmetic_kva
            else r.s_effective_kva
        end as s_billing_kva,
        least(r.v_a, r.v_b, r.v_c) / s.nominal_line_to_neutral_v as voltage_low,
        greatest(r.v_a, r.v_b, r.v_c) / s.nominal_line_to_neutral_v as voltage_high,
        coalesce(r.i_n_metered_a, r.i_n_a::double) as neutral_a
    from reading as r
    join service_setting as s using (service)
),
summed as (
    select
        service,
        month,
        count(*) as intervals,
        sum(interval_min)::bigint as minutes_present,
        sum(case when p_kw is not null then interval_min else 0 end)::bigint as minutes_with_p,
        sum(case when q_kvar is not null then interval_min else 0 end)::bigint as minutes_with_q,
        fsum(case when p_kw is not null then greatest(p_kw, 0) * hours end) as energy_kwh,
        fsum(case when p_kw is not null then greatest(-p_kw, 0) * hours end) as energy_export_kwh,
        fsum(case when q_kvar is not null then greatest(q_kvar, 0) * hours end) as reactive_lagging_kvarh,
        fsum(case when q_kvar is not null then greatest(-q_kvar, 0) * hours end) as reactive_leading_kvarh,
        fsum(s_billing_kva * hours) as apparent_kvah,
        fsum(
            case
                when p_kw is not null and q_kvar is not null
                    then greatest(q_kvar - p_kw * tangent_target, 0) * hours
            end
        ) as kvarh_above_target,
        fsum(hours) filter (
            -- From the doubles, and at the target is not below it.
            (p_kw * q_kvar > 0 or (p_kw = 0 and q_kvar > 0))
            and pf_vector is not null
            and abs(p_kw) < (target_pf - 1e-9::double) * s_vector_kva
        ) as low_pf_hours_found,
        fsum(hours) filter (q_kvar < 0) as leading_hours_found,
        max(i_a) as i_a_max,
        max(i_b) as i_b_max,
        max(i_c) as i_c_max,
        quantile_cont(vuf::double, 0.95::double) as vuf_p95,
        quantile_cont(lvur::double, 0.95::double) as lvur_p95,
        quantile_cont(current_unbalance::double, 0.95::double) as current_unbalance_p95,
        max(neutral_a) as neutral_current_max_a,
        min(voltage_low) as voltage_min_pu,
        max(voltage_high) as voltage_max_pu,
        fsum(hours) filter (
            voltage_low < voltage_low_pu or voltage_high > voltage_high_pu
        ) as hours_outside_band_found,
        fsum(hours) filter (voltage_low is not null) as hours_with_voltage,
        any_value(rating_a) as rating_a
    from interval_of_month
    group by service, month
)
select
    summed.* exclude (low_pf_hours_found, leading_hours_found, hours_outside_band_found),
    -- No such hour is 0 where it could be seen, and null where it could not.
    case when minutes_with_q > 0 then coalesce(low_pf_hours_found, 0) end as low_pf_hours,
    case when minutes_with_q > 0 then coalesce(leading_hours_found, 0) end as leading_hours,
    case when voltage_min_pu is not null then coalesce(hours_outside_band_found, 0) end
        as hours_outside_voltage_band,
    minutes_with_p::double / calendar_month.minutes as completeness,
    greatest(i_a_max, i_b_max, i_c_max) as peak_current_a,
    case greatest(i_a_max, i_b_max, i_c_max)
        when i_a_max then 'a'
        when i_b_max then 'b'
        when i_c_max then 'c'
    end as peak_current_phase,
    greatest(i_a_max, i_b_max, i_c_max) / rating_a as peak_current_utilisation
from summed
join calendar_month using (month);
