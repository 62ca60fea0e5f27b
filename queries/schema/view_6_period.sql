-- Unbroken runs of intervals that need attention. A run begins where the measure passes its
-- enter threshold and ends where it comes back past the leave threshold, where the load falls
-- under its floor, where the measure is not known, or at a gap. `mean` is the plain mean of a
-- ratio; a power factor is never averaged and its mean is left to P and Q energies.
-- args: none
-- row: one period of one kind of one service
create or replace view period as
with loaded_interval as (
    select
        r.*,
        s.target_pf,
        s.tangent_target,
        s.nominal_line_to_neutral_v,
        s.voltage_low_pu,
        s.voltage_high_pu,
        greatest(r.i_a, r.i_b, r.i_c) as largest_a,
        coalesce(
            greatest(r.i_a, r.i_b, r.i_c) / s.rating_a,
            r.s_vector_kva / s.rating_kva,
            0
        ) as load_fraction,
        greatest(r.i_a, r.i_b, r.i_c) / s.rating_a as utilisation,
        least(r.v_a, r.v_b, r.v_c) / s.nominal_line_to_neutral_v as voltage_low,
        greatest(r.v_a, r.v_b, r.v_c) / s.nominal_line_to_neutral_v as voltage_high,
        lag(r.start_utc + to_minutes(r.interval_min)) over (
            partition by r.service order by r.start_utc
        ) is distinct from r.start_utc as after_gap
    from reading as r
    join service_setting as s using (service)
),
measured as (
    select
        i.service,
        i.start_utc,
        i.interval_min,
        i.utc_offset_min,
        i.after_gap,
        i.p_kw,
        i.q_kvar,
        i.tangent_target,
        k.kind,
        k.enter_above,
        k.leave_at,
        k.minimum_min,
        k.unit,
        case
            when i.load_fraction < k.load_floor_fraction then null
            when k.kind in ('low-pf', 'leading') and i.pf_vector is null then null
            when k.kind = 'low-pf' and (i.p_kw * i.q_kvar > 0 or (i.p_kw = 0 and i.q_kvar > 0))
                then -abs(i.p_kw) / i.s_vector_kva
            when k.kind = 'leading' and (i.p_kw * i.q_kvar < 0 or (i.p_kw = 0 and i.q_kvar < 0))
                then -abs(i.p_kw) / i.s_vector_kva
            when k.kind = 'current-imbalance' then i.current_unbalance
            when k.kind = 'voltage-imbalance' and k.measure = 'vuf' then i.vuf
            when k.kind = 'voltage-imbalance' then i.lvur
            when k.kind = 'voltage'
                then greatest(i.voltage_low_pu - i.voltage_low, i.voltage_high - i.voltage_high_pu)
            when k.kind = 'overload' then i.utilisation
        end as badness,
        case
            when k.kind <> 'voltage' then null
            when i.voltage_low_pu - i.voltage_low >= i.voltage_high - i.voltage_high_pu
                then i.voltage_low
            else i.voltage_high
        end as voltage_at_worst,
        case
            when k.kind = 'overload'
                then case i.largest_a when i.i_a then 'a' when i.i_b then 'b' else 'c' end
            when k.kind = 'voltage'
                and i.voltage_low_pu - i.voltage_low >= i.voltage_high - i.voltage_high_pu
                then case least(i.v_a, i.v_b, i.v_c)
                    when i.v_a then 'a' when i.v_b then 'b' else 'c' end
            when k.kind = 'voltage'
                then case greatest(i.v_a, i.v_b, i.v_c)
                    when i.v_a then 'a' when i.v_b then 'b' else 'c' end
            when k.kind = 'current-imbalance'
                then case greatest(
                        abs(i.i_a - (i.i_a + i.i_b + i.i_c) / 3),
                        abs(i.i_b - (i.i_a + i.i_b + i.i_c) / 3),
                        abs(i.i_c - (i.i_a + i.i_b + i.i_c) / 3)
                    )
                    when abs(i.i_a - (i.i_a + i.i_b + i.i_c) / 3) then 'a'
                    when abs(i.i_b - (i.i_a + i.i_b + i.i_c) / 3) then 'b'
                    else 'c' end
        end as phase
    from loaded_interval as i
    join period_rule as k using (service)
),
judged as (
    select
        *,
        case
            when badness > enter_above then 1
            when badness is null or badness <= leave_at or after_gap then 0
        end as turn
    from measured
),
held as (
    select
        *,
        last_value(turn ignore nulls) over (
            partition by service, kind order by start_utc
        ) = 1 as inside
    from judged
),
opened as (
    select
        *,
        inside
        and (
            after_gap
            or not coalesce(lag(inside) over (partition by service, kind order by start_utc), false)
        ) as opens
    from held
),
numbered as (
    select
        *,
        sum(opens::integer) over (
            partition by service, kind order by start_utc rows unbounded preceding
        ) as run
    from opened
),
run_of_intervals as (
    select
        service,
        kind,
        run,
        unit,
        minimum_min,
        min(start_utc) as start_utc,
        max(start_utc + to_minutes(interval_min)) as end_utc,
        arg_min(utc_offset_min, start_utc) as start_offset_min,
        count(*) as intervals,
        sum(interval_min) as minutes,
        max(badness) as badness_max,
        arg_max(
            start_utc, struct_pack(badness := badness, earlier := -epoch_us(start_utc))
        ) as worst_utc,
        favg(badness) as badness_mean,
        arg_max(phase, struct_pack(badness := badness, earlier := -epoch_us(start_utc))) as phase,
        arg_max(
            voltage_at_worst, struct_pack(badness := badness, earlier := -epoch_us(start_utc))
        ) as voltage_worst,
        favg(voltage_at_worst) as voltage_mean,
        fsum(p_kw * interval_min / 60.0::double) as net_energy_kwh,
        fsum(q_kvar * interval_min / 60.0::double) as net_reactive_kvarh,
        fsum(greatest(p_kw, 0) * interval_min / 60.0::double) as energy_kwh,
        fsum(
            greatest(q_kvar - p_kw * tangent_target, 0) * interval_min / 60.0::double
        ) as kvarh_above_target
    from numbered
    where inside
    group by service, kind, run, unit, minimum_min
)
select
    service,
    kind,
    phase,
    start_utc,
    start_utc + to_minutes(start_offset_min) as start_local,
    end_utc,
    minutes / 60.0::double as hours,
    intervals,
    case
        when kind = 'voltage' then voltage_worst
        when kind in ('low-pf', 'leading') then -badness_max
        else badness_max
    end as worst,
    case
        when kind = 'voltage' then voltage_mean
        when kind in ('low-pf', 'leading') then null
        else badness_mean
    end as mean,
    worst_utc,
    unit,
    energy_kwh,
    kvarh_above_target,
    net_energy_kwh,
    net_reactive_kvarh
from run_of_intervals
where minutes >= minimum_min;
