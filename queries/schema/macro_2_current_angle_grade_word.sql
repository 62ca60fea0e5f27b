-- The word of a current-angle grade.
-- args: none
-- row: none (a function)
create or replace macro current_angle_grade_word(code) as
case code when 0 then 'per-phase' when 1 then 'shared' when 2 then 'equal' end;
