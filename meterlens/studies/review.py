"""The monthly review: what a month took, how it ran, and what needs attention."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from meterlens.errors import RequestError
from meterlens.limits import CONTINUOUS_FRACTION
from meterlens.settings import Service
from meterlens.store.database import Store
from meterlens.store.setting_rows import month_bounds
from meterlens.studies.findings import Finding, ranked
from meterlens.studies.period_findings import period_findings
from meterlens.studies.periods import service_periods
from meterlens.studies.site_time import local_iso

__all__ = ["review_months"]

_NEEDS_P = (
    "energy_kwh",
    "energy_export_kwh",
    "peak_demand_kw",
    "load_factor",
)
_NEEDS_Q = (
    "reactive_lagging_kvarh",
    "reactive_leading_kvarh",
    "apparent_kvah",
    "pf_energy_weighted",
    "low_pf_hours",
    "leading_hours",
    "kvarh_above_target",
    "peak_demand_kva",
    "pf_at_peak",
)


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
    known = [row["month"] for row in store.rows("month/names")]
    for month in months:
        if month not in known:
            raise RequestError(
                f"there are no readings in {month}", hint="Months: " + ", ".join(known) + "."
            )
    services = [store.site.service(service)] if service else list(store.site.services)
    notes: list[dict[str, Any]] = [
        {"key": "cost.total", "reason": "this version applies no tariff"},
        {"key": "change_vs_previous_month", "reason": "this version does not compare months"},
    ]
    by_month: dict[str, list[dict[str, Any]]] = {}
    for one in services:
        for entry in _service_months(store, one, set(months), notes):
            by_month.setdefault(entry.pop("month"), []).append(entry)
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
    peaks: dict[tuple[str, str], dict[str, Any]] = {
        (row["month"], row["peak"]): row
        for row in store.rows("month/peak_demand", service=service.id, month=only)
    }
    periods = service_periods(store, service, month=only)
    entries = []
    for row in sums:
        month = row["month"]
        if wanted and month not in wanted:
            continue
        entry = {"month": month} | _figures(store, service, row, peaks)
        own = [p for p in periods if p["start"].startswith(month)]
        notes += _unknown(service, month, entry, row)
        entry["findings"] = ranked(_findings(store, service, entry, own))
        entries.append(entry)
    return entries


def _figures(
    store: Store,
    service: Service,
    row: dict[str, Any],
    peaks: dict[tuple[str, str], dict[str, Any]],
) -> dict[str, Any]:
    """One month's figures, each by its definition."""
    has_p, has_q = row["minutes_with_p"] > 0, row["minutes_with_q"] > 0
    energy = row["energy_kwh"] if has_p else None
    lagging = row["reactive_lagging_kvarh"] if has_q else None
    leading = row["reactive_leading_kvarh"] if has_q else None
    kw = peaks.get((row["month"], "kw"))
    kva = peaks.get((row["month"], "kva"))
    peak_kw = None if kw is None else kw["p_kw"]
    hours = row["minutes_with_p"] / 60.0
    has_current, has_voltage = row["peak_current_a"] is not None, row["voltage_min_pu"] is not None
    return {
        "service": service.id,
        "completeness": row["completeness"],
        "energy_kwh": energy,
        "energy_export_kwh": row["energy_export_kwh"] if has_p else None,
        "reactive_lagging_kvarh": lagging,
        "reactive_leading_kvarh": leading,
        "apparent_kvah": row["apparent_kvah"] if has_q else None,
        "pf_energy_weighted": _pf(energy, None if lagging is None else lagging - leading),
        "peak_demand_kw": peak_kw,
        "peak_demand_start": _instant(store, kw),
        "peak_demand_kva": None if kva is None else float(np.hypot(kva["p_kw"], kva["q_kvar"])),
        "peak_demand_kva_start": _instant(store, kva),
        "pf_at_peak": None if kw is None else _pf(kw["p_kw"], kw["q_kvar"]),
        "load_factor": energy / hours / peak_kw if energy is not None and peak_kw else None,
        "peak_current_a": row["peak_current_a"],
        "peak_current_phase": row["peak_current_phase"],
        "peak_current_utilisation": row["peak_current_utilisation"],
        "low_pf_hours": (row["low_pf_hours"] or 0.0) if has_q else None,
        "leading_hours": (row["leading_hours"] or 0.0) if has_q else None,
        "kvarh_above_target": row["kvarh_above_target"] if has_q else None,
        "vuf_p95": row["vuf_p95"],
        "lvur_p95": row["lvur_p95"],
        "current_unbalance_p95": row["current_unbalance_p95"],
        "neutral_current_max_a": row["neutral_current_max_a"] if has_current else None,
        "voltage_min_pu": row["voltage_min_pu"],
        "voltage_max_pu": row["voltage_max_pu"],
        "hours_outside_voltage_band": (row["hours_outside_voltage_band"] or 0.0)
        if has_voltage
        else None,
        "change_vs_previous_month": {},
        "change_vs_same_month_last_year": {},
        "cost": {"lines": [], "total": None},
        "reconciliation": [],
    }


def _pf(p: float | None, q: float | None) -> float | None:
    """P over √(P² + Q²); None where either is not known or both are zero."""
    if p is None or q is None:
        return None
    apparent = float(np.hypot(p, q))
    return p / apparent if apparent > 0 else None


def _instant(store: Store, peak: dict[str, Any] | None) -> str | None:
    return None if peak is None else local_iso(store.site, peak["start_utc"])


def _unknown(
    service: Service, month: str, entry: dict[str, Any], row: dict[str, Any]
) -> list[dict[str, Any]]:
    """Why a figure of the month is null, and what the month leans on."""
    reasons: dict[str, str] = {}
    no_q = "the record has no total reactive power (Q) in this month"
    no_p = "the record has no total power (P) in this month"
    for key in (*_NEEDS_P, *_NEEDS_Q):
        if entry[key] is None:
            reasons[key] = no_q if key in _NEEDS_Q else no_p
    if entry["peak_demand_kw"] is None and row["minutes_with_p"] > 0:
        reasons["peak_demand_kw"] = (
            f"no {service.demand_window_min}-minute window of the month is complete"
        )
    for key, what in (
        ("peak_current_a", "no phase currents"),
        ("neutral_current_max_a", "no phase currents with their angles"),
        ("voltage_min_pu", "no line-to-neutral voltages"),
        ("vuf_p95", "no loaded interval with three voltages"),
        ("lvur_p95", "no loaded interval with three voltages"),
        ("current_unbalance_p95", "no loaded interval with three currents"),
    ):
        if entry[key] is None:
            reasons[key] = f"the record has {what} in this month"
    notes = [
        {"key": key, "service": service.id, "month": month, "reason": reason}
        for key, reason in reasons.items()
    ]
    if 0 < row["minutes_with_q"] < row["minutes_with_p"]:
        share = row["minutes_with_q"] / row["minutes_with_p"]
        notes.append(
            {
                "key": "reactive_lagging_kvarh",
                "service": service.id,
                "month": month,
                "reason": f"reactive power is known for {share:.1%} of the time with power",
            }
        )
    return notes


def _findings(
    store: Store, service: Service, entry: dict[str, Any], periods: list[dict[str, Any]]
) -> list[Finding]:
    columns = service.columns
    assumed = columns is not None and columns.assume is not None
    findings = period_findings(service, periods, sign_is_assumed=assumed)
    start, end = (
        local_iso(store.site, instant.replace(tzinfo=None))
        for instant in month_bounds(store.site.timezone, entry["month"])
    )
    missing = 1.0 - entry["completeness"]
    if missing > 1e-9:
        findings.append(
            Finding(
                kind="incomplete-month",
                service=service.id,
                phase=None,
                start=start,
                end=end,
                severity="look" if missing >= 0.01 else "note",
                magnitude=missing,
                unit="fraction",
                confidence="high",
                text=f"{missing:.2%} of the month has no total power; sums cover the rest only.",
                next_step="Run meterlens check to see where, and export the missing days again.",
            )
        )
    findings += _near_rating(service, entry, start, end)
    return findings


def _near_rating(service: Service, entry: dict[str, Any], start: str, end: str) -> list[Finding]:
    """A peak above the continuous limit of the breaker, yet not above its rating."""
    share = entry["peak_current_utilisation"]
    limit = min(service.breaker_continuous_percent / 100.0, 1.0)
    if share is None or limit >= 1.0 or not limit < share <= 1.0:
        return []
    return [
        Finding(
            kind="near-rating",
            service=service.id,
            phase=entry["peak_current_phase"],
            start=start,
            end=end,
            severity="look",
            magnitude=share,
            unit="fraction",
            confidence="high",
            text=f"The highest interval current is {share:.1%} of the {service.rating_a:g} A "
            f"rating; load that lasts three hours or more should stay under "
            f"{CONTINUOUS_FRACTION.value:.0%} unless the breaker is marked otherwise.",
            next_step="See how long it lasts, and whether load can be moved to other hours.",
        )
    ]
