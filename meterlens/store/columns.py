"""The columns of the one table, and where each comes from.

This is the crossing between the kernel's SI units (V, A, W, var, VA) and the store's trade
units (kW, kvar, kVA).
"""

from __future__ import annotations

import re

__all__ = [
    "DERIVED_FRACTIONS",
    "DERIVED_PHASES",
    "DERIVED_TOTALS",
    "FURTHER_COLUMNS",
    "NUMBER",
    "READING_COLUMNS",
    "STORE_COLUMN",
    "WATTS_PER_KILOWATT",
]

WATTS_PER_KILOWATT = 1000.0

#: A printed number with either decimal mark.
NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?")

#: Key of a column map → column of the store, in the order of the table.
STORE_COLUMN = {
    "v_a": "v_a",
    "v_b": "v_b",
    "v_c": "v_c",
    "v_ab": "v_ab",
    "v_bc": "v_bc",
    "v_ca": "v_ca",
    "i_a": "i_a",
    "i_b": "i_b",
    "i_c": "i_c",
    "i_n": "i_n_metered_a",
    "pf_a": "pf_exported_a",
    "pf_b": "pf_exported_b",
    "pf_c": "pf_exported_c",
    "pf_total": "pf_exported_total",
    "lead_lag_a": "lead_lag_a",
    "lead_lag_b": "lead_lag_b",
    "lead_lag_c": "lead_lag_c",
    "lead_lag_total": "lead_lag_total",
    "p_a_kw": "p_metered_a_kw",
    "p_b_kw": "p_metered_b_kw",
    "p_c_kw": "p_metered_c_kw",
    "q_a_kvar": "q_metered_a_kvar",
    "q_b_kvar": "q_metered_b_kvar",
    "q_c_kvar": "q_metered_c_kvar",
    "s_a_kva": "s_metered_a_kva",
    "s_b_kva": "s_metered_b_kva",
    "s_c_kva": "s_metered_c_kva",
    "p_kw": "p_metered_kw",
    "q_kvar": "q_metered_kvar",
    "s_kva": "s_metered_kva",
}

READING_COLUMNS = tuple(STORE_COLUMN.values())

#: Readings that few exports have, kept in one list column: their places in it, from 0. The
#: statements name the same places from 1; a test compares them.
FURTHER_COLUMNS = tuple(
    name
    for name in READING_COLUMNS
    if name.startswith(("v_ab", "v_bc", "v_ca", "lead_lag", "p_metered", "q_metered", "s_metered"))
    or name == "pf_exported_total"
)

#: Kernel field → (name pattern, divisor, stored as double), one column a phase.
DERIVED_PHASES = {
    "p": ("p_{}_kw", WATTS_PER_KILOWATT, True),
    "q": ("q_{}_kvar", WATTS_PER_KILOWATT, True),
    "s": ("s_{}_kva", WATTS_PER_KILOWATT, True),
    "pf": ("pf_{}", 1.0, False),
    "r_wye": ("r_wye_{}_ohm", 1.0, False),
    "x_wye": ("x_wye_{}_ohm", 1.0, False),
}

#: Kernel field → column, divided by 1000 and stored as double: these are summed.
DERIVED_TOTALS = {
    "p_total": "p_kw",
    "q_total": "q_kvar",
    "s_vector": "s_vector_kva",
    "s_arithmetic": "s_arithmetic_kva",
    "s_effective": "s_effective_kva",
}

#: Kernel field → column, stored as float: nobody sums a ratio.
DERIVED_FRACTIONS = {
    "pf_vector": "pf_vector",
    "pf_arithmetic": "pf_arithmetic",
    "pf_effective": "pf_effective",
    "r_delta": "r_delta_ohm",
    "x_delta": "x_delta_ohm",
    "vuf": "vuf",
    "lvur": "lvur",
    "pvur": "pvur",
    "iuf2": "iuf2",
    "iuf0": "iuf0",
    "current_unbalance": "current_unbalance",
    "i_neutral": "i_n_a",
}
