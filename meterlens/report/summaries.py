"""A service in a few figures: the head of its page and its card on the index."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Final

from meterlens.errors import RequestError
from meterlens.report import tables
from meterlens.report.facts import ServiceFacts, ServicePage
from meterlens.report.findings_table import all_findings, count_words
from meterlens.report.words import (
    CONNECTIONS,
    UNKNOWN,
    number,
    percent,
    quantity,
    sense_words,
    share,
    when,
)

__all__ = ["Summary", "fact_list", "newest", "page_name", "readouts_of", "summarise"]

#: Term, value and remarks.
Readout = tuple[str, str, list[str]]

_ID: Final = re.compile(r"[a-z0-9-]+")


@dataclass(frozen=True)
class Summary:
    """The little of a service that the index shows, kept while its readings are let go."""

    name: str
    page: str
    connection: str
    record: list[tuple[str, str]]
    month: str
    readouts: list[Readout]
    counts: list[tuple[str, str]]
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


def newest(months: list[dict[str, Any]]) -> dict[str, Any]:
    """Return the newest month, empty where there is none."""
    return max(months, key=lambda m: str(m.get("month")), default={})


def fact_list(service: ServiceFacts) -> list[tuple[str, str]]:
    """Return the settings that the page shows: term and value."""
    low, high = service.voltage_band_pu
    volts = service.nominal_voltage_v
    return [
        ("Connection", CONNECTIONS.get(service.connection, service.connection)),
        ("Nominal voltage", f"{quantity(volts, 'V')} line to line" if volts else UNKNOWN),
        (
            "Rating",
            f"{quantity(service.rating_a, 'A')} a phase" if service.rating_a else "not given",
        ),
        ("Target power factor", f"{service.target_pf:g} lagging"),
        ("Voltage band", f"{low:g}–{high:g} pu"),
        ("Demand window", f"{service.demand_window_min} min"),
        ("Time zone", service.timezone),
    ]


def readouts_of(page: ServicePage) -> list[Readout]:
    """Return the newest month in six figures: term, value and remarks.

    Where the record has other months, a remark says the worst of all of them.
    """
    month = newest(page.months)
    if not month:
        return []
    used = month.get("peak_current_utilisation")
    at_peak = number(month.get("pf_at_peak"), 3)
    worst = _worst_of_record(page.months, month)
    leading = sense_words(month.get("leading_hours"), assumed=page.service.sense_assumed)
    if not page.service.sense_assumed and worst["leading"]:
        leading += f"; {worst['leading']}"
    current = ["" if used is None else f"{percent(used, 0)} of the rating", worst["current"]]
    plan: list[tuple[str, str, list[str]]] = [
        (
            "Energy",
            quantity(month.get("energy_kwh"), "kWh", 0),
            [f"{share(month.get('completeness'))} recorded"],
        ),
        (
            "Peak demand",
            quantity(month.get("peak_demand_kw"), "kW", 1),
            [when(month.get("peak_demand_start")), worst["demand"]],
        ),
        ("Load factor", number(month.get("load_factor"), 2), ["mean over peak"]),
        (
            "Power factor",
            number(month.get("pf_energy_weighted"), 3),
            [f"{at_peak} at the peak", worst["factor"]],
        ),
        ("Peak current", quantity(month.get("peak_current_a"), "A"), current),
        (
            "Low power factor",
            quantity(month.get("low_pf_hours"), "h", 1),
            [worst["low"], f"leading {leading}"],
        ),
    ]
    return [(term, value, [r for r in remarks if r]) for term, value, remarks in plan]


def _worst_of_record(months: list[dict[str, Any]], newest_month: dict[str, Any]) -> dict[str, str]:
    """Return remarks on all months together, each empty where the newest says it already."""

    def beyond(key: str, join: Callable[[list[float]], float], digits: int) -> float | None:
        known = [float(m[key]) for m in months if m.get(key) is not None]
        whole = join(known) if known else None
        same = number(whole, digits) == number(newest_month.get(key), digits)
        return None if same else whole

    def remark(key: str, join: Callable[[list[float]], float], unit: str, digits: int) -> str:
        whole = beyond(key, join, digits)
        return "" if whole is None else f"whole record {quantity(whole, unit, digits)}"

    lowest = beyond("pf_energy_weighted", min, 3)
    return {
        "demand": remark("peak_demand_kw", max, "kW", 1),
        "factor": "" if lowest is None else f"lowest month {number(lowest, 3)}",
        "current": remark("peak_current_a", max, "A", 0),
        "low": remark("low_pf_hours", sum, "h", 1),
        "leading": remark("leading_hours", sum, "h", 1),
    }


def summarise(page: ServicePage) -> Summary:
    """Return what the index keeps of a service; its readings may then be let go."""
    ordered = sorted(page.months, key=lambda m: str(m.get("month")))[-24:]
    energies = [float(m.get("energy_kwh") or 0) for m in ordered]
    top = max(energies, default=0.0) or 1.0
    bars = [
        {
            "x": 12 * place,
            "height": round(44 * energy / top, 1),
            "words": f"{m.get('month')}: {quantity(m.get('energy_kwh'), 'kWh', 0)}",
        }
        for place, (m, energy) in enumerate(zip(ordered, energies, strict=True))
    ]
    words = ""
    if ordered:
        words = (
            f"Energy by month, {ordered[0].get('month')} to {ordered[-1].get('month')}; "
            f"highest {quantity(top, 'kWh', 0)}"
        )
    return Summary(
        name=page.service.name,
        page=page_name(page.service.id),
        connection=CONNECTIONS.get(page.service.connection, page.service.connection),
        record=tables.record_words(page.check),
        month=str(newest(page.months).get("month") or ""),
        readouts=readouts_of(page),
        counts=count_words(all_findings(page)),
        bars=bars if len(bars) > 2 else [],
        bars_words=words,
    )
