-- The store's copy of the period rules of every service.
-- args: none
-- row: one kind of one service
select
    service,
    kind,
    measure,
    enter_above,
    leave_at,
    minimum_min,
    load_floor_fraction,
    unit
from period_rule
order by service, kind;
