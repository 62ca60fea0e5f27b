-- Forget which rows of one file repeated another's.
-- args: $file_id
-- row: none
delete from repeated_reading
where file_id = $file_id;
