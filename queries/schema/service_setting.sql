-- The settings that the views lean on, copied from the site folder by each command.
-- args: none
-- row: one service
create table if not exists service_setting (
    service varchar not null,
    name varchar not null,
    timezone varchar not null,
    nominal_voltage_v double not null,
    nominal_line_to_neutral_v double not null,
    rating_a double not null,
    rating_kva double not null,
    target_pf double not null,
    tangent_target double not null,
    voltage_low_pu double not null,
    voltage_high_pu double not null,
    demand_window_min integer not null,
    demand_kind varchar not null,
    billing_kva varchar not null,
    derivation_digest varchar not null
);
