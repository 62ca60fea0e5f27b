-- The store's copy of the settings of every service.
-- args: none
-- row: one service
select
    service,
    name,
    timezone,
    nominal_voltage_v,
    nominal_line_to_neutral_v,
    rating_a,
    rating_kva,
    target_pf,
    tangent_target,
    voltage_low_pu,
    voltage_high_pu,
    demand_window_min,
    demand_kind,
    billing_kva,
    derivation_digest
from service_setting
order by service;
