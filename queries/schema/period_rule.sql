-- When a period of each kind begins and ends. The measure is turned so that more is worse.
-- args: none
-- row: one kind of one service
create table if not exists period_rule (
    service varchar not null,
    kind varchar not null,
    measure varchar not null,
    enter_above double not null,
    leave_at double not null,
    minimum_min double not null,
    load_floor_fraction double not null,
    unit varchar not null
);
