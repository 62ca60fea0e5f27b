-- Take the rows of one file away that nothing else wrote to.
-- args: $service, $file_id
-- row: none
delete from reading
where service = $service
    and file_id = $file_id;
