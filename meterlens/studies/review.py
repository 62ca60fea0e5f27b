"""The monthly review: what a month took, how it ran, and what needs attention."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from meterlens.electrical.power import apparent_power_vector, power_factor_of_totals
from meterlens.settings import Service
from meterlens.store.database import Store
from meterlens.studies.check import stale_notes
from meterlens.studies.findings import ranked
from meterlens.studies.flag_findings import mismatch_finding
from meterlens.studies.month_findings import month_findings
from meterlens.studies.periods import service_periods
from meterlens.studies.review_notes import month_notes
from meterlens.studies.site_time import local_iso, refuse_unknown_months

__all__ = ["review_months"]


def review_months(
    store: Store, *, months: Sequence[str] = (), service: str | None = None
) -> dict[str, Any]:
    """The result of ``meterlens review``.

    Parameters
    ----------
    store : Store
    months : sequence of str
        ``YYYY-MM`` in site time; every month with readings where empty.
    service : str, optional
        A service's id; all where left out.

    Returns
    -------
    dict
        ``months`` (each with its ``services``), ``findings`` and ``notes``: energies in
        kWh, kvarh and kVAh, demand in kW and kVA, currents in A, ratios as fractions.

    Raises
    ------
    RequestError
        No such service, or a month without readings.

    Notes
    -----
    ``pf_energy_weighted`` = kWh/√(kWh² + (lagging − leading)²), the average power factor
    of tariffs; ``pf_at_peak`` is that of the kW-peak window's averages.
    """
    refuse_unknown_months(store, months)
    services = [store.site.service(service)] if service else list(store.site.services)
    notes: list[dict[str, Any]] = [
        {"key": "cost.total", "reason": "this version applies no tariff"},
        {"key": "change_vs_previous_month", "reason": "this version does not compare months"},
    ]
    by_month: dict[str, list[dict[str, Any]]] = {}
    for one in services:
        for entry in _service_months(store, one, set(months), notes):
            by_month.setdefault(entry.pop("month"), []).append(entry)
    notes += stale_notes(store, services)
    return {
        "site": store.site.name,
        "months": [{"month": month, "services": by_month[month]} for month in sorted(by_month)],
        "notes": notes,
    }


def _service_months(
    store: Store, service: Service, wanted: set[str], notes: list[dict[str, Any]]
) -> list[dict[str, Any]]:
    only = next(iter(wanted)) if len(wanted) == 1 else None
    sums = store.rows("month/sums", service=service.id, month=only)
    if not sums:
        return []
    peaks: dict[tuple[str, str], dict[str, Any]] = {
        (row["month"], row["peak"]): row
        for row in store.rows("month/peak_demand", service=service.id, month=only)
    }
    periods = service_periods(store, service, month=only)
    share = service.breaker_continuous_percent / 100.0
    longest = {
        row["month"]: row
        for row in store.rows("month/longest_over", service=service.id, share=share)
    }
    interval_min = store.rows("check/record", service=service.id)[0]["interval_min"]
    flags = {row["flag"] for row in store.rows("check/flag_count", service=service.id)}
    mismatch = mismatch_finding(store, service)
    entries = []
    for row in sums:
        month = row["month"]
        if wanted and month not in wanted:
            continue
        entry = {"month": month} | _figures(store, service, row, peaks)
        own = month_notes(service, month, entry, row, peaks.get((month, "kw")), interval_min)
        notes += own
        unknown = {note["key"]: note["reason"] for note in own}
        has_power = row["minutes_with_p"] > 0 and entry["peak_demand_kw"] is None
        findings = month_findings(
            store,
            service,
            entry,
            [p for p in periods if p["start"].startswith(month)],
            longest.get(month),
            sign_is_assumed="lead-lag-assumed" in flags,
            demand_note=unknown["peak_demand_kw"] if has_power else None,
        )
        entry["findings"] = ranked(findings + mismatch)
        entries.append(entry)
    return entries


def _figures(
    store: Store,
    service: Service,
    row: dict[str, Any],
    peaks: dict[tuple[str, str], dict[str, Any]],
) -> dict[str, Any]:
    """One month's figures, each by its definition."""
    energy = row["energy_kwh"]
    lagging, leading = row["reactive_lagging_kvarh"], row["reactive_leading_kvarh"]
    kw = peaks.get((row["month"], "kw"))
    kva = peaks.get((row["month"], "kva"))
    peak_kw = None if kw is None else kw["p_kw"]
    hours = row["minutes_with_p"] / 60.0
    return {
        "service": service.id,
        "completeness": row["completeness"],
        "energy_kwh": energy,
        "energy_export_kwh": row["energy_export_kwh"],
        "reactive_lagging_kvarh": lagging,
        "reactive_leading_kvarh": leading,
        "apparent_kvah": row["apparent_kvah"],
        "pf_energy_weighted": power_factor_of_totals(
            energy, None if lagging is None else lagging - leading
        ),
        "peak_demand_kw": peak_kw,
        "peak_demand_start": _instant(store, kw),
        "peak_demand_kva": None
        if kva is None
        else float(apparent_power_vector(np.array(kva["p_kw"]), np.array(kva["q_kvar"]))),
        "peak_demand_kva_start": _instant(store, kva),
        "pf_at_peak": None if kw is None else power_factor_of_totals(kw["p_kw"], kw["q_kvar"]),
        "load_factor": energy / hours / peak_kw if energy is not None and peak_kw else None,
        "peak_current_a": row["peak_current_a"],
        "peak_current_phase": row["peak_current_phase"],
        "peak_current_utilisation": row["peak_current_utilisation"],
        "low_pf_hours": row["low_pf_hours"],
        "leading_hours": row["leading_hours"],
        "kvarh_above_target": row["kvarh_above_target"],
        "vuf_p95": row["vuf_p95"],
        "lvur_p95": row["lvur_p95"],
        "current_unbalance_p95": row["current_unbalance_p95"],
        "neutral_current_max_a": row["neutral_current_max_a"],
        "voltage_min_pu": row["voltage_min_pu"],
        "voltage_max_pu": row["voltage_max_pu"],
        "hours_outside_voltage_band": row["hours_outside_voltage_band"],
        "change_vs_previous_month": {},
        "change_vs_same_month_last_year": {},
        "cost": {"lines": [], "total": None},
        "reconciliation": [],
    }


def _instant(store: Store, peak: dict[str, Any] | None) -> str | None:
    return None if peak is None else local_iso(store.site, peak["start_utc"])
