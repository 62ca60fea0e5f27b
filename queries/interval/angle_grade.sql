-- The angle grades of one service's record, the commonest first.
-- args: $service
-- row: one pair of grades
select
    angle_grade_word(angle_grade_code) as angle_grade,
    current_angle_grade_word(current_angle_grade_code) as current_angle_grade,
    count(*) as intervals
from reading
where service = $service
group by all
order by intervals desc, angle_grade, current_angle_grade;
