-- Take all rows of one service away, before they are derived anew.
-- args: $service
-- row: none
delete from reading
where service = $service;
