-- The word of a voltage-angle grade.
-- args: none
-- row: none (a function)
create or replace macro angle_grade_word(code) as
case code when 0 then 'measured' when 1 then 'triangle' when 2 then 'nominal' end;
