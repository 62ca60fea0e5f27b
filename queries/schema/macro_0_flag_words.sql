-- The words of an interval's flag bits.
-- args: none
-- row: none (a function)
create or replace macro flag_words(bits) as
list_filter(
    [
        case when bits & 1 <> 0 then 'light-load' end,
        case when bits & 2 <> 0 then 'no-load' end,
        case when bits & 4 <> 0 then 'pf-clamped' end,
        case when bits & 8 <> 0 then 'lead-lag-assumed' end,
        case when bits & 16 <> 0 then 'q-unknown' end,
        case when bits & 32 <> 0 then 'power-mismatch' end,
        case when bits & 64 <> 0 then 'sign-unexpected' end,
        case when bits & 128 <> 0 then 'incomplete' end,
        case when bits & 256 <> 0 then 'q-from-volt-amperes' end,
        case when bits & 512 <> 0 then 'light-phase' end,
        case when bits & 1024 <> 0 then 'angles-do-not-close' end
    ],
    lambda word: word is not null
);
