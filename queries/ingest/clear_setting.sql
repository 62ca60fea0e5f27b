-- Take the copy of the settings away, before it is written anew.
-- args: none
-- row: none
delete from service_setting;
