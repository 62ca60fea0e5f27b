"""The column dictionary of DEVELOPERS.md, made from a fresh store.

    python tests/architecture/column_dictionary.py --write

writes it between its two marks. A column without a meaning here is an error, so a new
column of a view is described before it is shipped.
"""

from __future__ import annotations

import re
import sys
from pathlib import Path
from tempfile import TemporaryDirectory

from meterlens.settings import load_site, write_new_site
from meterlens.store.database import open_store
from meterlens.store.query_files import load_query, query_names
from meterlens.store.questions import VIEWS

__all__ = ["PAGE", "dictionary", "with_dictionary"]

PAGE = Path(__file__).resolve().parents[2] / "DEVELOPERS.md"
BEGINS, ENDS = "<!-- columns begin -->", "<!-- columns end -->"

#: Ending of a name → unit; the first that fits.
UNITS = (
    (r"_utc$", "UTC, no offset"),
    (r"_local$", "site clock"),
    (r"(^|_)ohm$", "Ω"),
    (r"(^|_)kvarh(_|$)", "kvarh"),
    (r"_kvah$", "kVAh"),
    (r"_kwh$", "kWh"),
    (r"_kvar$", "kvar"),
    (r"_kva$", "kVA"),
    (r"_kw$", "kW"),
    (r"_pu$", "of nominal"),
    (r"^v_", "V"),
    (r"^(vuf|lvur|pvur|iuf[02]|current_unbalance)|^pf_(a|b|c|v|ar|ef)|completeness|utilis", "1"),
    (r"^pf_exported", "as printed"),
    (r"^i_|current_(max_)?a$|^rating_a$", "A"),
    (r"_min$|^minutes", "min"),
    (r"hours", "h"),
    (r"^size_bytes$", "byte"),
)

#: Name → meaning; {} stands for a phase, or a pair of phases.
MEANINGS = {
    "service": "the service's id in site.toml",
    "start_utc": "start of the interval, window or period",
    "start_local": "the same instant on the site's clock (a repeated hour shows twice)",
    "end_utc": "end of the period's last interval",
    "interval_min": "length of an interval",
    "utc_offset_min": "site clock less UTC at the start",
    "file_id": "number of the file that the row came from, as in `file`",
    "line": "1-based line in that file",
    "v_{}": "rms voltage, line to neutral (`v_a`) or line to line (`v_ab`)",
    "i_{}": "rms line current",
    "i_n_metered_a": "neutral current as metered",
    "pf_exported_{}": "power factor as the export printed it, sign and percent untouched",
    "pf_exported_total": "the total's power factor as printed",
    "lead_lag_{}": "+1 lagging, −1 leading, from a column of words",
    "lead_lag_total": "the same of one column for all phases",
    "p_metered_{}_kw": "active power of the phase as metered",
    "q_metered_{}_kvar": "reactive power of the phase as metered",
    "s_metered_{}_kva": "apparent power of the phase as metered",
    "p_metered_kw": "total active power as metered",
    "q_metered_kvar": "total reactive power as metered",
    "s_metered_kva": "total apparent power as metered",
    "p_{}_kw": "active power of the phase, consumed is positive",
    "q_{}_kvar": "reactive power of the phase, lagging is positive",
    "s_{}_kva": "V·I of the phase",
    "pf_{}": "P/S of the phase, signed as P; null under the light-load floor",
    "p_kw": "ΣP; of a demand window its mean",
    "q_kvar": "ΣQ; of a demand window its mean",
    "s_vector_kva": "√(P²+Q²)",
    "s_arithmetic_kva": "Σ V·I",
    "s_effective_kva": "3·Ve·Ie of IEEE Std 1459",
    "pf_vector": "P over `s_vector_kva`",
    "pf_arithmetic": "P over `s_arithmetic_kva`",
    "pf_effective": "P over `s_effective_kva`",
    "r_wye_{}_ohm": "resistance of the phase's terminal equivalent, line to neutral",
    "x_wye_{}_ohm": "reactance of the same, inductive is positive",
    "r_delta_{}_ohm": "resistance between two lines; three-wire services only",
    "x_delta_{}_ohm": "reactance of the same",
    "r_delta_ohm": "resistance of the balanced part's delta equivalent, 3·V₁/I₁",
    "x_delta_ohm": "reactance of the same",
    "vuf": "|V₂|/|V₁| (IEC 61000-4-30)",
    "lvur": "largest deviation of the line-to-line voltages from their mean, over the mean",
    "pvur": "the same of the line-to-neutral voltages",
    "iuf2": "|I₂|/|I₁|",
    "iuf0": "|I₀|/|I₁|",
    "current_unbalance": "largest deviation of the line currents from their mean, over the mean",
    "i_n_a": "|Ia+Ib+Ic| of the phasors: fundamental only, an estimate",
    "angle_grade": "what the voltage angles lean on: measured, triangle or nominal",
    "current_angle_grade": "what the current angles lean on: per-phase, shared or equal",
    "flags": "words of what the derived values lean on",
    "window_min": "length of the window: the service's, or the interval where that is longer",
    "complete": "the whole window has P",
    "q_complete": "the whole window has Q",
    "month": "calendar month of the site, YYYY-MM",
    "intervals": "number of intervals",
    "minutes_present": "minutes with a reading",
    "minutes_with_p": "minutes with a total P",
    "minutes_with_q": "minutes with a total Q",
    "energy_kwh": "Σ max(P, 0)·Δt",
    "energy_export_kwh": "Σ max(−P, 0)·Δt",
    "reactive_lagging_kvarh": "Σ max(Q, 0)·Δt",
    "reactive_leading_kvarh": "Σ max(−Q, 0)·Δt",
    "apparent_kvah": "Σ S·Δt of the service's `billing_kva`",
    "kvarh_above_target": "Σ max(0, Q − P·tan φ of the target)·Δt",
    "low_pf_hours": "hours lagging, under the target and above the light-load floor",
    "leading_hours": "hours with Q < 0",
    "i_{}_max": "highest interval current of the phase",
    "vuf_p95": "95th percentile, by linear interpolation",
    "lvur_p95": "95th percentile",
    "current_unbalance_p95": "95th percentile",
    "neutral_current_max_a": "highest neutral current, the metered where there is one",
    "voltage_min_pu": "lowest line-to-neutral voltage over nominal/√3",
    "voltage_max_pu": "highest of the same",
    "hours_outside_voltage_band": "hours with a phase outside `voltage_band_pu`",
    "hours_with_voltage": "hours with a line-to-neutral voltage",
    "rating_a": "the service's rating",
    "completeness": "`minutes_with_p` over the minutes of the calendar month",
    "peak_current_a": "highest interval current of any phase",
    "peak_current_phase": "its phase: a, b or c",
    "peak_current_utilisation": "`peak_current_a` over the rating",
    "kind": "low-pf, leading, current-imbalance, voltage-imbalance, voltage or overload",
    "phase": "the phase at fault at the worst interval, where one can be named",
    "hours": "length of the period",
    "worst": "the measure at its worst, in `unit`",
    "mean": "mean of the measure; null for power factors, which are never averaged",
    "unit": "unit of `worst` and `mean`",
    "worst_utc": "start of the interval in which the measure is at its worst",
    "net_energy_kwh": "Σ P·Δt, signed",
    "net_reactive_kvarh": "Σ Q·Δt, signed",
    "file": "path of the export",
    "path": "path of the export when it was read",
    "column": "key of the column map, where one value is at fault; null: the whole row",
    "reason": "why it could not be read",
    "text": "what stands there",
    "size_bytes": "size of the file",
    "sha256": "fingerprint of the file's bytes",
    "map_digest": "fingerprint of the column map that read it",
    "ingested_utc": "when it was read",
    "rows_read": "non-blank lines after the header and the units row",
    "rows_stored": "new intervals, or rows that only filled missing values",
    "rows_replaced": "rows that changed a stored value",
    "rows_duplicate": "rows that changed nothing",
    "rows_rejected": "rows that could not be read",
    "values_rejected": "single values left blank",
    "values_clamped": "power factors up to half a percent above 1, taken as 1",
    "replaced_by_file_id": "number of the file whose line replaced this version",
    "replaced_by_line": "that line",
}


def _pattern(column: str) -> str:
    """The column with its phase, or pair of phases, taken out."""
    if column in MEANINGS:
        return column
    return re.sub(r"_(a|b|c|ab|bc|ca)(?=_|$)", "_{}", column, count=1)


def _unit(column: str) -> str:
    return next((unit for ending, unit in UNITS if re.search(ending, column)), "")


def _view_columns() -> dict[str, list[tuple[str, str]]]:
    """View → its columns and their types, of a store that was just made."""
    with TemporaryDirectory() as folder:
        write_new_site(Path(folder))
        with open_store(load_site(Path(folder)), write=True) as store:
            relations = {view: store.con.view(view) for view in VIEWS}
            return {
                view: list(zip(relation.columns, map(str, relation.types), strict=True))
                for view, relation in relations.items()
            }


def _about(view: str) -> str:
    name = next(n for n in query_names() if re.fullmatch(rf"schema/view_\d_{view}", n))
    query = load_query(name)
    return f"{query.about} A row is {query.row}."


def dictionary() -> str:
    """Every view's columns, with type, unit and meaning, as Markdown.

    Raises
    ------
    KeyError
        A column has no meaning in `MEANINGS`.
    """
    parts = []
    for view, columns in _view_columns().items():
        kinds = dict(columns)
        grouped: dict[str, list[str]] = {}
        for name in kinds:
            grouped.setdefault(_pattern(name), []).append(name)
        lines = [f"#### `{view}`", "", _about(view), "", "| column | type | unit | meaning |"]
        lines.append("| --- | --- | --- | --- |")
        for pattern, names in grouped.items():
            shown = ", ".join(f"`{name}`" for name in names)
            kind = kinds[names[0]].lower()
            meaning = MEANINGS[pattern].replace("|", r"\|")
            lines.append(f"| {shown} | {kind} | {_unit(names[0])} | {meaning} |")
        parts.append("\n".join(lines))
    return "\n\n".join(parts)


def with_dictionary(page: str) -> str:
    """A page with the dictionary of today between its marks."""
    before, rest = page.split(BEGINS)
    _, after = rest.split(ENDS)
    return f"{before}{BEGINS}\n\n{dictionary()}\n\n{ENDS}{after}"


if __name__ == "__main__":
    new = with_dictionary(PAGE.read_text(encoding="utf-8"))
    if "--write" in sys.argv:
        PAGE.write_text(new, encoding="utf-8")
    else:
        print(new)
