-- Keep versions that were written over, handed over as a table.
-- args: none
-- row: none
insert into superseded_reading by name select * from superseded_row;
