-- Take stored rows away at the starts handed over, before they are written anew.
-- args: $service
-- row: none
delete from reading
where service = $service
    and start_utc in (select start_utc from start_to_remove);
