-- Keep what could not be read, handed over as a table.
-- args: none
-- row: none
insert into rejected by name select * from rejected_row;
