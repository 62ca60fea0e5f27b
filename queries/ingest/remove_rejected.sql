-- Forget what could not be read of one file.
-- args: $file_id
-- row: none
delete from rejected
where file_id = $file_id;
