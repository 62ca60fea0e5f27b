-- Forget the repeats at the starts handed over, before their versions are folded anew.
-- args: $service
-- row: none
delete from repeated_reading
where service = $service
    and start_utc in (select start_utc from start_to_remove);
