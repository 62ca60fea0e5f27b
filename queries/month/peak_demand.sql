-- The complete demand window with the highest kW and the one with the highest kVA of each
-- month of one service; ties go to the earliest. Windows belong to the month they start in.
-- args: $service, $month
-- row: one month and one kind of peak
with window_of_month as (
    select
        strftime(start_local, '%Y-%m') as month,
        start_utc,
        window_min,
        p_kw,
        case when q_complete then q_kvar end as q_kvar
    from demand
    where service = $service
        and complete
        and ($month::varchar is null or strftime(start_local, '%Y-%m') = $month)
),
peak_kw as (
    select
        'kw' as peak,
        *
    from window_of_month
    qualify row_number() over (partition by month order by p_kw desc, start_utc) = 1
),
peak_kva as (
    select
        'kva' as peak,
        *
    from window_of_month
    where q_kvar is not null
    qualify row_number() over (
        partition by month order by p_kw * p_kw + q_kvar * q_kvar desc, start_utc
    ) = 1
)
select * from peak_kw
union all
select * from peak_kva
order by month, peak;
