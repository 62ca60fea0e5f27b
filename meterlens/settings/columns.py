"""The columns that an export can have, by their names inside the program.

A mapped column is named by its header, or by its 1-based number where the export has
no header line (``header_row = 0``).
"""

from __future__ import annotations

from typing import Annotated

from pydantic import BeforeValidator

from meterlens.settings.kinds import Settings, fault

__all__ = ["TEXT_COLUMNS", "VALUE_COLUMNS", "ColumnName", "TextColumns", "ValueColumns"]


def _column_name(name: object) -> object:
    if isinstance(name, bool) or not isinstance(name, str | int):
        raise fault("a column is named by its header in quotes, or by its number")
    if isinstance(name, int) and name < 1:
        raise fault("columns are numbered from 1")
    if isinstance(name, str) and not name.strip():
        raise fault("a column needs a name", hint="Leave the key out where there is no column.")
    return name


ColumnName = Annotated[str | int, BeforeValidator(_column_name)]
Mapped = ColumnName | None


class ValueColumns(Settings):
    """Columns that hold numbers: V, A, fractions, kW, kvar, kVA, degrees, kWh, kvarh."""

    v_a: Mapped = None
    v_b: Mapped = None
    v_c: Mapped = None
    v_ab: Mapped = None
    v_bc: Mapped = None
    v_ca: Mapped = None
    i_a: Mapped = None
    i_b: Mapped = None
    i_c: Mapped = None
    i_n: Mapped = None
    pf_a: Mapped = None
    pf_b: Mapped = None
    pf_c: Mapped = None
    pf_total: Mapped = None
    p_a_kw: Mapped = None
    p_b_kw: Mapped = None
    p_c_kw: Mapped = None
    q_a_kvar: Mapped = None
    q_b_kvar: Mapped = None
    q_c_kvar: Mapped = None
    s_a_kva: Mapped = None
    s_b_kva: Mapped = None
    s_c_kva: Mapped = None
    p_kw: Mapped = None
    q_kvar: Mapped = None
    s_kva: Mapped = None
    thd_v_a: Mapped = None
    thd_v_b: Mapped = None
    thd_v_c: Mapped = None
    thd_i_a: Mapped = None
    thd_i_b: Mapped = None
    thd_i_c: Mapped = None
    angle_v_a_deg: Mapped = None
    angle_v_b_deg: Mapped = None
    angle_v_c_deg: Mapped = None
    angle_i_a_deg: Mapped = None
    angle_i_b_deg: Mapped = None
    angle_i_c_deg: Mapped = None
    energy_kwh: Mapped = None
    energy_export_kwh: Mapped = None
    reactive_lagging_kvarh: Mapped = None
    reactive_leading_kvarh: Mapped = None
    register_kwh: Mapped = None
    register_export_kwh: Mapped = None
    register_lagging_kvarh: Mapped = None
    register_leading_kvarh: Mapped = None


class TextColumns(Settings):
    """Columns that hold words or codes: lead or lag, quadrants, a status, a service."""

    lead_lag_a: Mapped = None
    lead_lag_b: Mapped = None
    lead_lag_c: Mapped = None
    lead_lag_total: Mapped = None
    quadrant_a: Mapped = None
    quadrant_b: Mapped = None
    quadrant_c: Mapped = None
    quadrant_total: Mapped = None
    quality: Mapped = None
    service: Mapped = None


VALUE_COLUMNS: tuple[str, ...] = tuple(ValueColumns.model_fields)
TEXT_COLUMNS: tuple[str, ...] = tuple(TextColumns.model_fields)
