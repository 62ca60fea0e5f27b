-- Copy one period rule into the store.
-- args: $service, $kind, $measure, $enter_above, $leave_at, $minimum_min, $load_floor_fraction, $unit
-- row: none
insert into period_rule
values (
    $service,
    $kind,
    $measure,
    $enter_above,
    $leave_at,
    $minimum_min,
    $load_floor_fraction,
    $unit
);
