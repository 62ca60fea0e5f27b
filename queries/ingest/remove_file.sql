-- Forget what became of one file.
-- args: $file_id
-- row: none
delete from ingested_file
where file_id = $file_id;
