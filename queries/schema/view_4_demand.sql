-- Average power in every demand window of a service's own length and kind. Windows start on
-- the site clock (block) or with every interval (sliding); data coarser than the window stand
-- as they are. A window with a missing part is not complete and never sets a peak.
-- args: none
-- row: one demand window of one service
create or replace view demand as
with interval_of_window as (
    select
        r.service,
        r.start_utc,
        r.utc_offset_min,
        r.interval_min,
        r.start_utc + to_minutes(r.utc_offset_min) as start_local,
        s.demand_kind,
        greatest(s.demand_window_min, r.interval_min) as window_min,
        case when r.p_kw is not null then r.interval_min else 0 end as p_min,
        case when r.q_kvar is not null then r.interval_min else 0 end as q_min,
        r.p_kw * r.interval_min as p_kw_min,
        r.q_kvar * r.interval_min as q_kvar_min
    from reading as r
    join service_setting as s using (service)
),
placed as (
    select
        *,
        start_local
            - to_minutes((60 * hour(start_local) + minute(start_local)) % window_min)
            - to_seconds(second(start_local)) as block_local
    from interval_of_window
),
block_window as (
    select
        service,
        block_local - to_minutes(utc_offset_min) as start_utc,
        block_local as start_local,
        utc_offset_min,
        window_min,
        sum(p_min) as p_min,
        sum(q_min) as q_min,
        fsum(p_kw_min) as p_kw_min,
        fsum(q_kvar_min) as q_kvar_min
    from placed
    where demand_kind = 'block'
    group by all
),
sliding_window as (
    select
        service,
        start_utc,
        start_local,
        utc_offset_min,
        window_min,
        sum(p_min) over following_window as p_min,
        sum(q_min) over following_window as q_min,
        fsum(p_kw_min) over following_window as p_kw_min,
        fsum(q_kvar_min) over following_window as q_kvar_min
    from placed
    where demand_kind = 'sliding'
    window following_window as (
        partition by service
        order by start_utc
        range between current row and to_minutes(window_min - interval_min) following
    )
),
every_window as (
    select * from block_window
    union all
    select * from sliding_window
)
select
    service,
    start_utc,
    start_local,
    utc_offset_min,
    window_min,
    p_min = window_min as complete,
    q_min = window_min as q_complete,
    case when p_min > 0 then p_kw_min / p_min end as p_kw,
    case when q_min > 0 then q_kvar_min / q_min end as q_kvar
from every_window;
