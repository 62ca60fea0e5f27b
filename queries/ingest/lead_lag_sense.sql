-- A printed word for lagging or leading as +1 or -1, or null where it is neither.
-- args: none
-- row: none (a function)
create or replace temp macro lead_lag_sense(printed) as
case
    when lower(trim(printed)) in ('lag', 'lagging', 'ind', 'ind.', 'inductive', 'i', 'l') then 1.0::double
    when lower(trim(printed)) in ('lead', 'leading', 'cap', 'cap.', 'capacitive', 'c') then -1.0::double
end;
