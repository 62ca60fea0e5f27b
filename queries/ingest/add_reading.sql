-- Write derived rows, handed over as batches.
-- args: none
-- row: none
insert into reading by name select * from derived_row;
