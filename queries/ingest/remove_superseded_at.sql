-- Take the earlier versions away at the starts handed over, before they are folded anew.
-- args: $service
-- row: none
delete from superseded_reading
where service = $service
    and start_utc in (select start_utc from start_to_remove);
