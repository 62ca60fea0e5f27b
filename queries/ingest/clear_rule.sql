-- Take the copy of the period rules away, before it is written anew.
-- args: none
-- row: none
delete from period_rule;
