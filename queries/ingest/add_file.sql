-- Keep what became of one file.
-- args: $file_id, $service, $path, $size_bytes, $sha256, $map_digest, $ingested_utc, $interval_min, $rows_read, $rows_stored, $rows_replaced, $rows_duplicate, $rows_rejected, $values_rejected, $values_clamped
-- row: none
insert into ingested_file
values (
    $file_id,
    $service,
    $path,
    $size_bytes,
    $sha256,
    $map_digest,
    $ingested_utc,
    $interval_min,
    $rows_read,
    $rows_stored,
    $rows_replaced,
    $rows_duplicate,
    $rows_rejected,
    $values_rejected,
    $values_clamped
);
