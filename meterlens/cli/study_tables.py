"""The studies' results as tables that fit 80 columns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from meterlens.cli.console import number, print_table, say
from meterlens.studies.findings import counted

__all__ = ["print_check", "print_findings", "print_periods", "print_review"]


def _when(iso: str | None) -> str:
    """Local date and time of an ISO instant, to the minute."""
    return "–" if iso is None else iso[:16].replace("T", " ")


def print_check(result: dict[str, Any]) -> None:
    """What ``meterlens check`` found."""
    rows = [
        [
            s["service"],
            _when(s["first"]),
            _when(s["last"]),
            number(s["interval_min"]),
            number(s["completeness"], 2, percent=True),
            number(len(s["gaps"])),
        ]
        for s in result["services"]
    ]
    print_table(
        "The record of each service (site time)",
        ["service", "from", "to", "min", "complete", "gaps"],
        rows,
        left=(0, 1, 2),
    )
    gaps = [
        [s["service"], _when(g["start"]), _when(g["end"]), number(g["missing_intervals"])]
        for s in result["services"]
        for g in s["gaps"]
    ]
    if gaps:
        print_table("Gaps", ["service", "from", "to", "intervals"], gaps[:20], left=(0, 1, 2))
        if len(gaps) > 20:
            say(f"and {len(gaps) - 20} more; --json lists all")
    print_findings([f for s in result["services"] for f in s["findings"]])


def print_findings(findings: Sequence[dict[str, Any]], title: str = "What was found") -> None:
    """Findings, most pressing first, with what to do next."""
    if not findings:
        say("Nothing that needs attention.")
        return
    order = ("urgent", "act", "look", "note")
    ranked = sorted(findings, key=lambda f: (order.index(f["severity"]), f["start"]))
    rows = [[f["severity"], f["service"], f"{f['text']} {f['next_step']}"] for f in ranked]
    print_table(title, ["", "service", "finding and next step"], rows, left=(0, 1), wrapped=(2,))


def print_periods(result: dict[str, Any], labels: Mapping[str, Sequence[str]]) -> None:
    """Periods in order of service and start, phases by the site's own labels."""
    rows = [
        [
            p["service"],
            p["kind"],
            _when(p["start"]),
            number(p["hours"], 2),
            labels[p["service"]]["abc".index(p["phase"])] if p["phase"] else "",
            _measure(p, "worst"),
            _measure(p, "mean"),
        ]
        for p in result["periods"]
    ]
    if not rows:
        say("No periods that need attention.")
        return
    print_table(
        f"{counted(len(rows), 'period')} to look at (site time)",
        ["service", "kind", "from", "hours", "phase", "worst", "mean"],
        rows,
        left=(0, 1, 2, 4),
    )
    say("Power factors are those of the period's energies, never averages.")


def _measure(period: dict[str, Any], key: str) -> str:
    value = period[key]
    if period["kind"] in ("low-pf", "leading", "voltage"):
        return number(value, 3)
    return number(value, 1, percent=True)


def print_review(result: dict[str, Any]) -> None:
    """Each month: findings first, then the figures."""
    for month in result["months"]:
        services = month["services"]
        findings = [f for s in services for f in s["findings"]]
        print_findings(findings, f"{month['month']}: what needs attention")
        _print_energy(month["month"], services)
        _print_quality(month["month"], services)
    if result["months"]:
        say("PF: kWh over √(kWh² + (lagging − leading kvarh)²), never an average.")
        say("Hours of low PF and leading count every interval, periods only longer runs.")
    for note in result["notes"]:
        if note["key"] == "columns":
            say(f"{note['service']}: {note['reason']}.")


def _print_energy(month: str, services: Sequence[dict[str, Any]]) -> None:
    rows = [
        [
            s["service"],
            number(s["energy_kwh"]),
            number(s["reactive_lagging_kvarh"]),
            number(s["pf_energy_weighted"], 3),
            number(s["peak_demand_kw"], 1),
            number(s["peak_demand_kva"], 1),
            _when(s["peak_demand_start"])[5:],
            number(s["load_factor"], 2),
        ]
        for s in services
    ]
    print_table(
        f"{month}: energy and demand",
        [
            "service",
            "kWh",
            "kvarh\nlagging",
            "PF",
            "peak\nkW",
            "peak\nkVA",
            "kW peak at",
            "load\nfactor",
        ],
        rows,
        left=(0, 6),
    )


def _print_quality(month: str, services: Sequence[dict[str, Any]]) -> None:
    rows = [
        [
            s["service"],
            number(s["completeness"], 1, percent=True),
            number(s["peak_current_a"], 0),
            number(s["peak_current_utilisation"], 0, percent=True),
            number(s["low_pf_hours"], 1),
            number(s["leading_hours"], 1),
            number(s["current_unbalance_p95"], 1, percent=True),
            number(s["vuf_p95"], 2, percent=True),
            number(s["hours_outside_voltage_band"], 1),
        ]
        for s in services
    ]
    print_table(
        f"{month}: how it ran (imbalance: not exceeded 95 % of the loaded time)",
        [
            "service",
            "record",
            "peak\nA",
            "of\nrating",
            "low PF\nh",
            "leading\nh",
            "current\nimb.",
            "voltage\nimb.",
            "V out\nh",
        ],
        rows,
    )
