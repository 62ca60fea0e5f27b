"""A service in a few figures: the head of its page and its card on the index."""

from __future__ import annotations

import json
import re
from dataclasses import dataclass
from typing import Any, Final

from meterlens.errors import RequestError
from meterlens.report import tables
from meterlens.report.facts import ServiceFacts, ServicePage
from meterlens.report.words import CONNECTIONS, UNKNOWN, number, percent, when

__all__ = ["Summary", "distinct", "fact_list", "newest", "page_name", "readouts_of", "summarise"]

_ID: Final = re.compile(r"[a-z0-9-]+")


@dataclass(frozen=True)
class Summary:
    """The little of a service that the index shows, kept while its readings are let go."""

    name: str
    page: str
    connection: str
    record: list[tuple[str, str]]
    month: str
    readouts: list[tuple[str, str, str]]
    counts: list[tuple[str, int]]
    bars: list[dict[str, Any]]
    bars_words: str


def page_name(service_id: str) -> str:
    """Return the file name of a service's page.

    Parameters
    ----------
    service_id : str
        ``[a-z0-9-]+``; a service called ``index`` gives way to the site's index.
    """
    if not _ID.fullmatch(service_id):
        raise RequestError(
            f"service id {service_id!r} cannot name a page.", hint="Use a-z, 0-9 and hyphens."
        )
    return "index_.html" if service_id == "index" else f"{service_id}.html"


def distinct(findings: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """Drop findings that reach the page by two ways (a check's, repeated by a review)."""
    seen: dict[str, dict[str, Any]] = {}
    for finding in findings:
        seen.setdefault(json.dumps(finding, sort_keys=True, default=str), finding)
    return list(seen.values())


def newest(months: list[dict[str, Any]]) -> dict[str, Any]:
    """Return the newest month, empty where there is none."""
    return max(months, key=lambda m: str(m.get("month")), default={})


def fact_list(service: ServiceFacts) -> list[tuple[str, str]]:
    """Return the settings that the page shows: term and value."""
    low, high = service.voltage_band_pu
    volts = service.nominal_voltage_v
    return [
        ("Connection", CONNECTIONS.get(service.connection, service.connection)),
        ("Nominal voltage", f"{number(volts)} V line to line" if volts else UNKNOWN),
        ("Rating", f"{number(service.rating_a)} A a phase" if service.rating_a else "not given"),
        ("Target power factor", f"{service.target_pf:g} lagging"),
        ("Voltage band", f"{low:g}–{high:g} pu"),
        ("Demand window", f"{service.demand_window_min} min"),
        ("Clock", service.timezone),
    ]


def readouts_of(page: ServicePage) -> list[tuple[str, str, str]]:
    """Return the newest month in six figures: term, value and a remark."""
    month = newest(page.months)
    if not month:
        return []
    share = month.get("peak_current_utilisation")
    demand, energy = month.get("peak_demand_kw"), month.get("energy_kwh")
    at_peak = number(month.get("pf_at_peak"), 3)
    return [
        ("Energy", f"{number(energy, 0)} kWh", f"{percent(month.get('completeness'))} recorded"),
        ("Peak demand", f"{number(demand, 1)} kW", when(month.get("peak_demand_start"))),
        ("Load factor", number(month.get("load_factor"), 2), "mean over peak"),
        (
            "Power factor",
            number(month.get("pf_energy_weighted"), 3),
            f"{at_peak} at the peak",
        ),
        (
            "Peak current",
            f"{number(month.get('peak_current_a'))} A",
            "" if share is None else f"{percent(share, 0)} of the rating",
        ),
        (
            "Low power factor",
            f"{number(month.get('low_pf_hours'), 1)} h",
            f"{number(month.get('leading_hours'), 1)} h leading",
        ),
    ]


def summarise(page: ServicePage) -> Summary:
    """Return what the index keeps of a service; its readings may then be let go."""
    findings = distinct([*page.findings, *(page.check.get("findings") or [])])
    weights = [str(f.get("severity")) for f in findings]
    counts = [(w, weights.count(w)) for w in ("urgent", "act", "look", "note")]
    ordered = sorted(page.months, key=lambda m: str(m.get("month")))[-24:]
    energies = [float(m.get("energy_kwh") or 0) for m in ordered]
    top = max(energies, default=0.0) or 1.0
    bars = [
        {
            "x": 12 * place,
            "height": round(44 * energy / top, 1),
            "words": f"{m.get('month')}: {number(m.get('energy_kwh'), 0)} kWh",
        }
        for place, (m, energy) in enumerate(zip(ordered, energies, strict=True))
    ]
    words = ""
    if ordered:
        words = (
            f"Energy by month, {ordered[0].get('month')} to {ordered[-1].get('month')}; "
            f"highest {number(top, 0)} kWh"
        )
    return Summary(
        name=page.service.name,
        page=page_name(page.service.id),
        connection=CONNECTIONS.get(page.service.connection, page.service.connection),
        record=tables.record_words(page.check),
        month=str(newest(page.months).get("month") or ""),
        readouts=readouts_of(page),
        counts=[(w, n) for w, n in counts if n],
        bars=bars if len(bars) > 2 else [],
        bars_words=words,
    )
