-- Keep which rows repeated another file's, handed over as a table.
-- args: none
-- row: none
insert into repeated_reading by name select * from repeated_row;
