-- Which layout of tables and views this store has.
-- args: none
-- row: the one edition
create table if not exists store_edition (edition integer not null, version varchar not null);
