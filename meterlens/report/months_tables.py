"""The two tables of the months: what was drawn, and how the service ran."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from meterlens.report.facts import ServiceFacts
from meterlens.report.sheets import Column, Group, Table
from meterlens.report.tables import phase_name
from meterlens.report.words import number, percent, sense_words, share, when

__all__ = ["months_tables"]

Entry = dict[str, Any]
Plan = list[tuple[str, Callable[[Entry], str]]]

_DASH_WORDS = "A dash means: cannot be known from these readings."


def months_tables(months: list[Entry], service: ServiceFacts, currency: str) -> list[Table]:
    """Return two tables of one row a month, the newest first: energy and demand; running."""
    newest = sorted(months, key=lambda m: str(m.get("month")), reverse=True)
    energy = (
        "Calendar months in local time, the newest first. PF is power factor; that of the energy "
        f"is kWh over √(kWh² + kvarh²), never an average of power factors. {_DASH_WORDS}"
    )
    running = (
        "The hours below target and the leading hours count every interval of the month. An "
        "imbalance is the value that 95% of the month’s loaded time does not exceed. "
        f"{_DASH_WORDS}"
    )
    return [
        _table("Energy and demand", energy, newest, _energy_plan(newest, service, currency)),
        _table("How it ran", running, newest, _running_plan(service)),
    ]


def _table(name: str, caption: str, months: list[Entry], plan: Plan) -> Table:
    rows = tuple((str(m.get("month")), *(cell(m) for _, cell in plan)) for m in months)
    columns = (Column("Month"), *(Column(heading, "num") for heading, _ in plan))
    return Table(name, caption, columns, (Group("", rows),) if rows else ())


def _energy_plan(months: list[Entry], service: ServiceFacts, currency: str) -> Plan:
    def leading(month: Entry) -> str:
        kvarh = month.get("reactive_leading_kvarh")
        # The sign is the column map's: nothing leading was found because none can be.
        return "not measured" if service.sense_assumed and not kvarh else number(kvarh, 0)

    plan: Plan = [
        ("Data coverage", lambda m: share(m.get("completeness"))),
        ("Energy, kWh", lambda m: number(m.get("energy_kwh"), 0)),
        ("Lagging, kvarh", lambda m: number(m.get("reactive_lagging_kvarh"), 0)),
        ("Leading, kvarh", leading),
        ("PF of the energy", lambda m: number(m.get("pf_energy_weighted"), 3)),
        ("Peak demand, kW", lambda m: number(m.get("peak_demand_kw"), 1)),
        ("Time of the kW peak", lambda m: when(m.get("peak_demand_start"))),
        ("PF at the kW peak", lambda m: number(m.get("pf_at_peak"), 3)),
        ("Peak demand, kVA", lambda m: number(m.get("peak_demand_kva"), 1)),
        ("Load factor", lambda m: number(m.get("load_factor"), 2)),
    ]
    if any((m.get("cost") or {}).get("total") is not None for m in months):
        plan.append((f"Cost, {currency}", lambda m: number((m.get("cost") or {}).get("total"), 2)))
    return plan


def _running_plan(service: ServiceFacts) -> Plan:
    def current(month: Entry) -> str:
        text = number(month.get("peak_current_a"))
        phase = phase_name(service, month.get("peak_current_phase"))
        return f"{text} ({phase})" if phase else text

    def leading(month: Entry) -> str:
        hours = month.get("leading_hours")
        if service.sense_assumed:
            return sense_words(hours, assumed=True)
        return number(hours, 1)

    return [
        ("Peak current, A", current),
        ("Share of the rating", lambda m: percent(m.get("peak_current_utilisation"), 0)),
        ("Highest neutral current, A", lambda m: number(m.get("neutral_current_max_a"))),
        (f"Hours below PF {service.target_pf:g}", lambda m: number(m.get("low_pf_hours"), 1)),
        ("kvarh above target", lambda m: number(m.get("kvarh_above_target"), 0)),
        ("Hours leading", leading),
        ("Current imbalance", lambda m: percent(m.get("current_unbalance_p95"))),
        ("Voltage imbalance", lambda m: percent(m.get("vuf_p95"), 2)),
        (
            "Hours outside the voltage band",
            lambda m: number(m.get("hours_outside_voltage_band"), 1),
        ),
    ]
