"""The monthly review by brute force: loops over intervals, one definition at a time.

Written from the definitions alone and meant to be slow and obvious. Nothing of the
program is used.
"""

from __future__ import annotations

import math
from datetime import UTC, datetime, timedelta
from itertools import pairwise
from typing import Any
from zoneinfo import ZoneInfo

from plain_power import Service, Values, derive
from plain_reader import PHASES, ExportMap, Row

Derived = dict[datetime, Values]
Window = tuple[datetime, float, float | None]  # start (naive UTC), mean kW, mean kvar


def derive_all(
    intervals: dict[datetime, Row], export_map: ExportMap, service: Service
) -> dict[datetime, Values]:
    """Derived columns of every interval, in time order."""
    return {start: derive(intervals[start], export_map, service) for start in sorted(intervals)}


def local(start: datetime, zone: str) -> datetime:
    """A naive UTC instant on the site's clock."""
    return start.replace(tzinfo=UTC).astimezone(ZoneInfo(zone))


def iso_local(start: datetime, zone: str) -> str:
    """Site-local ISO 8601 with offset and seconds."""
    return local(start, zone).isoformat(timespec="seconds")


def month_of(start: datetime, zone: str) -> str:
    """The calendar month, in site time, in which an instant lies."""
    return local(start, zone).strftime("%Y-%m")


def minutes_of_month(month: str, zone: str) -> float:
    """Minutes from the first local midnight to the next month's, clock changes included."""
    year, number = int(month[:4]), int(month[5:])
    first = datetime(year, number, 1, tzinfo=ZoneInfo(zone))
    after = datetime(year + number // 12, number % 12 + 1, 1, tzinfo=ZoneInfo(zone))
    return (after.astimezone(UTC) - first.astimezone(UTC)).total_seconds() / 60.0


def percentile(values: list[float], share: float) -> float | None:
    """Linear interpolation between the order statistics at rank share·(n − 1)."""
    if not values:
        return None
    ordered = sorted(values)
    rank = share * (len(ordered) - 1)
    low = math.floor(rank)
    high = min(low + 1, len(ordered) - 1)
    return ordered[low] + (ordered[high] - ordered[low]) * (rank - low)


def demand_windows(
    derived: Derived, zone: str, interval_min: int, service: Service
) -> list[Window]:
    """Every complete demand window in time order.

    Block windows stand on the site's clock; sliding windows start with every interval.
    A window with an interval that is absent or has no total P is no window.
    """
    step = timedelta(minutes=interval_min)
    count = service.demand_window_min // interval_min
    found: list[Window] = []
    for start in sorted(derived):
        wall = local(start, zone)
        aligned = (wall.hour * 60 + wall.minute) % service.demand_window_min == 0
        if service.demand_kind == "block" and not aligned:
            continue
        members = [derived.get(start + k * step) for k in range(count)]
        powers = [member["p_kw"] for member in members if member is not None]
        known_p = [p for p in powers if p is not None]
        if len(known_p) < count:
            continue
        known_q = [
            q for member in members if member is not None and (q := member["q_kvar"]) is not None
        ]
        mean_q = math.fsum(known_q) / count if len(known_q) == count else None
        found.append((start, math.fsum(known_p) / count, mean_q))
    return found


def review(
    derived: Derived, zone: str, interval_min: int, service: Service
) -> dict[str, dict[str, Any]]:
    """The figures of every month that holds an interval.

    Parameters
    ----------
    derived : dict
        Derived columns by naive UTC start.
    zone : str
        IANA name of the site's zone.
    interval_min : int
        Length of an interval in minutes.
    service : Service
        Limits, rating and demand window.

    Returns
    -------
    dict
        Month (YYYY-MM) to figures, keyed as in the review's JSON.
    """
    windows = demand_windows(derived, zone, interval_min, service)
    out: dict[str, dict[str, Any]] = {}
    for month in sorted({month_of(start, zone) for start in derived}):
        members = [derived[start] for start in derived if month_of(start, zone) == month]
        hours = interval_min / 60.0
        figures = energy_figures(members, hours, service)
        present_h = hours * sum(x["p_kw"] is not None for x in members)
        figures["completeness"] = present_h * 60.0 / minutes_of_month(month, zone)
        figures |= demand_figures([w for w in windows if month_of(w[0], zone) == month], zone)
        peak = figures["peak_demand_kw"]
        figures["load_factor"] = (
            figures["energy_kwh"] / present_h / peak if peak and present_h else None
        )
        figures |= current_figures(members, service)
        figures |= voltage_figures(members, hours, service)
        for name in ("vuf", "lvur", "current_unbalance"):
            figures[f"{name}_p95"] = percentile(known(members, name), 0.95)
        out[month] = figures
    return out


def known(members: list[Values], name: str) -> list[float]:
    """The values of a column that are there."""
    return [value for x in members if (value := x[name]) is not None]


def energy_figures(members: list[Values], hours: float, service: Service) -> dict[str, Any]:
    """Energies (kWh, kvarh, kVAh) and the hours of lagging and leading PF."""
    slope = math.tan(math.acos(service.target_pf))
    kwh = math.fsum(max(p, 0.0) * hours for p in known(members, "p_kw"))
    lagging = math.fsum(max(q, 0.0) * hours for q in known(members, "q_kvar"))
    leading = math.fsum(max(-q, 0.0) * hours for q in known(members, "q_kvar"))
    above = low = 0.0
    for x in members:
        p, q, pf = x["p_kw"], x["q_kvar"], x["pf_vector"]
        if p is None or q is None:
            continue
        above += max(0.0, q - p * slope) * hours
        if pf is not None and abs(pf) < service.target_pf and p * q > 0.0:
            low += hours
    size = math.hypot(kwh, lagging - leading)
    return {
        "energy_kwh": kwh,
        "energy_export_kwh": math.fsum(max(-p, 0.0) * hours for p in known(members, "p_kw")),
        "reactive_lagging_kvarh": lagging,
        "reactive_leading_kvarh": leading,
        "apparent_kvah": math.fsum(s * hours for s in known(members, "s_vector_kva")),
        "pf_energy_weighted": kwh / size if size else None,
        "kvarh_above_target": above,
        "low_pf_hours": low,
        "leading_hours": hours * sum(q < 0.0 for q in known(members, "q_kvar")),
    }


def demand_figures(windows: list[Window], zone: str) -> dict[str, Any]:
    """The highest windows, earliest on a tie (kW, kVA)."""
    keys = ("peak_demand_kw", "peak_demand_start", "pf_at_peak")
    out: dict[str, Any] = dict.fromkeys((*keys, "peak_demand_kva", "peak_demand_kva_start"))
    for start, p, q in windows:
        kva = None if q is None else math.hypot(p, q)
        if out["peak_demand_kw"] is None or p > out["peak_demand_kw"]:
            out["peak_demand_kw"], out["peak_demand_start"] = p, iso_local(start, zone)
            out["pf_at_peak"] = p / kva if kva else None
        if kva is not None and (out["peak_demand_kva"] is None or kva > out["peak_demand_kva"]):
            out["peak_demand_kva"], out["peak_demand_kva_start"] = kva, iso_local(start, zone)
    return out


def current_figures(members: list[Values], service: Service) -> dict[str, Any]:
    """The largest phase current of any interval, and the largest neutral current (A)."""
    top, phase = None, None
    for x in members:
        for k in PHASES:
            amps = x[f"i_{k}"]
            if amps is not None and (top is None or amps > top):
                top, phase = amps, k
    neutral = [
        value
        for x in members
        if (value := x["i_n_a"] if x["i_n_metered_a"] is None else x["i_n_metered_a"]) is not None
    ]
    return {
        "peak_current_a": top,
        "peak_current_phase": phase,
        "peak_current_utilisation": None if top is None else top / service.rating_a,
        "neutral_current_max_a": max(neutral, default=None),
    }


def voltage_figures(members: list[Values], hours: float, service: Service) -> dict[str, Any]:
    """Voltage extremes in per unit of nominal/√3, and the hours outside the band."""
    base = service.nominal_voltage_v / math.sqrt(3.0)
    low, high = service.voltage_band_pu
    every: list[float] = []
    outside = 0.0
    for x in members:
        volts = [v / base for k in PHASES if (v := x[f"v_{k}"]) is not None]
        every += volts
        if any(v < low or v > high for v in volts):
            outside += hours
    return {
        "voltage_min_pu": min(every, default=None),
        "voltage_max_pu": max(every, default=None),
        "hours_outside_voltage_band": outside,
    }


def gaps(starts: list[datetime], interval_min: int) -> list[tuple[datetime, datetime, int]]:
    """Runs of absent intervals between the first and the last: start, end, how many."""
    step = timedelta(minutes=interval_min)
    ordered = sorted(starts)
    return [
        (before + step, after, round((after - before) / step) - 1)
        for before, after in pairwise(ordered)
        if after - before > step
    ]


def completeness_first_to_last(derived: Derived, interval_min: int) -> float:
    """Intervals with a total P over the intervals from the first to the last."""
    ordered = sorted(derived)
    span = (ordered[-1] - ordered[0]) / timedelta(minutes=interval_min) + 1
    return sum(x["p_kw"] is not None for x in derived.values()) / span
