"""Tables of a page: cells already in words, so that templates only lay them out."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Final

from meterlens.report.facts import PHASES, ServiceFacts
from meterlens.report.words import UNKNOWN, kind_words, number, percent, when

__all__ = [
    "Column",
    "Table",
    "findings_table",
    "gaps_table",
    "months_table",
    "notes_of",
    "periods_table",
    "record_words",
]

_MOST_PERIODS: Final = 60
_MOST_GAPS: Final = 60
_SEVERITY: Final = {"urgent": 0, "act": 1, "look": 2, "note": 3}
_PER_UNIT: Final = {"fraction", "", None}
_COUNTED: Final = {"rows", "values", "intervals"}

Entry = dict[str, Any]


@dataclass(frozen=True)
class Column:
    """A column's heading and the kind of its cells: ``num``, ``time``, ``long`` or plain."""

    heading: str
    kind: str = ""


@dataclass(frozen=True)
class Table:
    """A table ready to lay out.

    Attributes
    ----------
    caption : str
        What the rows are and how they are chosen.
    columns : tuple of Column
        Headings; the first one heads its row.
    rows : tuple of tuple of str
        Cells as text.
    """

    caption: str
    columns: tuple[Column, ...]
    rows: tuple[tuple[str, ...], ...]


def _phase(service: ServiceFacts, phase: Any) -> str:
    names = dict(zip(PHASES, service.phase_labels, strict=True)) | {"n": "neutral"}
    return "" if phase is None else names.get(str(phase), str(phase))


def _amount(value: Any, unit: Any) -> str:
    """Write a magnitude with its unit; a bare fraction keeps three decimals."""
    if value is None:
        return UNKNOWN
    if unit in _COUNTED:
        return f"{number(value, 0)} {unit}"
    return number(value, 3) if unit in _PER_UNIT else f"{number(value)} {unit}"


def months_table(months: list[Entry], service: ServiceFacts, currency: str) -> Table:
    """Return one row a month, the newest first."""

    def current(month: Entry) -> str:
        text = number(month.get("peak_current_a"))
        phase = _phase(service, month.get("peak_current_phase"))
        return f"{text} ({phase})" if phase else text

    def cost(month: Entry) -> str:
        return number((month.get("cost") or {}).get("total"), 2)

    plan: list[tuple[str, Callable[[Entry], str]]] = [
        ("Present", lambda m: percent(m.get("completeness"))),
        ("Energy, kWh", lambda m: number(m.get("energy_kwh"), 0)),
        ("Lagging, kvarh", lambda m: number(m.get("reactive_lagging_kvarh"), 0)),
        ("Leading, kvarh", lambda m: number(m.get("reactive_leading_kvarh"), 0)),
        ("PF of the energy", lambda m: number(m.get("pf_energy_weighted"), 3)),
        ("Peak demand, kW", lambda m: number(m.get("peak_demand_kw"), 1)),
        ("kW peak at", lambda m: when(m.get("peak_demand_start"))),
        ("Peak demand, kVA", lambda m: number(m.get("peak_demand_kva"), 1)),
        ("PF at the kW peak", lambda m: number(m.get("pf_at_peak"), 3)),
        ("Load factor", lambda m: number(m.get("load_factor"), 2)),
        ("Peak current, A", current),
        ("of rating", lambda m: percent(m.get("peak_current_utilisation"), 0)),
        ("PF below target, h", lambda m: number(m.get("low_pf_hours"), 1)),
        ("Leading, h", lambda m: number(m.get("leading_hours"), 1)),
        ("kvarh above target", lambda m: number(m.get("kvarh_above_target"), 0)),
        ("Current imbalance, p95", lambda m: percent(m.get("current_unbalance_p95"))),
        ("VUF, p95", lambda m: percent(m.get("vuf_p95"), 2)),
        ("Neutral, highest A", lambda m: number(m.get("neutral_current_max_a"))),
        ("Outside voltage band, h", lambda m: number(m.get("hours_outside_voltage_band"), 1)),
    ]
    if any((m.get("cost") or {}).get("total") is not None for m in months):
        plan.append((f"Cost, {currency}", cost))
    newest = sorted(months, key=lambda m: str(m.get("month")), reverse=True)
    rows = tuple((str(m.get("month")), *(cell(m) for _, cell in plan)) for m in newest)
    columns = (Column("Month"), *(Column(heading, "num") for heading, _ in plan))
    caption = (
        "Calendar months in local time, the newest first. Power factor of the energy is kWh over "
        "√(kWh² + kvarh²), never an average of power factors; p95 is the value that 95 % of the "
        "intervals do not exceed. A dash means: cannot be known from these readings."
    )
    return Table(caption, columns, rows)


def findings_table(findings: list[Entry], service: ServiceFacts, currency: str) -> Table:
    """Return one row a finding, the most urgent first."""
    ranked = sorted(
        findings,
        key=lambda f: (
            _SEVERITY.get(str(f.get("severity")), 9),
            -float(f.get("cost_per_month") or 0),
            str(f.get("start") or ""),
            str(f.get("kind")),
            str(f.get("phase") or ""),
        ),
    )
    rows = []
    for f in ranked:
        unit = f.get("unit")
        size = _amount(f.get("magnitude"), unit)
        if f.get("low") is not None and f.get("high") is not None:
            digits = 3 if unit in _PER_UNIT else None
            size += f"\n{number(f['low'], digits)} to {number(f['high'], digits)}"
        topic = kind_words(f.get("kind"))
        phase = _phase(service, f.get("phase"))
        span = when(f.get("start"))
        if f.get("end"):
            span += f" to\n{when(f['end'])}"
        rows.append(
            (
                str(f.get("severity") or ""),
                f"{topic}, {phase}" if phase else topic,
                str(f.get("text") or ""),
                span,
                size,
                number(f.get("cost_per_month"), 0),
                _confidence(f.get("confidence")),
                str(f.get("next_step") or ""),
            )
        )
    columns = (
        Column("Weight"),
        Column("Finding"),
        Column("What the readings show", "long"),
        Column("When", "time"),
        Column("Size (range)", "num"),
        Column(f"{currency} a month", "num"),
        Column("Confidence"),
        Column("Next step", "long"),
    )
    return Table("The weightiest first: urgent, act, look, note.", columns, tuple(rows))


def _confidence(value: Any) -> str:
    if value is None:
        return UNKNOWN
    return percent(value, 0) if isinstance(value, int | float) else str(value)


def periods_table(periods: list[Entry], service: ServiceFacts) -> Table:
    """Return one row a period, the longest first."""
    ranked = sorted(
        periods, key=lambda p: (-float(p.get("hours") or 0), str(p.get("start")), str(p["kind"]))
    )
    rows = tuple(
        (
            kind_words(p.get("kind")),
            _phase(service, p.get("phase")) or "all",
            when(p.get("start")),
            when(p.get("end")),
            number(p.get("hours"), 2),
            _amount(p.get("worst"), p.get("unit")),
            _amount(p.get("mean"), p.get("unit")),
            number(p.get("energy_kwh"), 0),
            number(p.get("kvarh_above_target"), 0),
        )
        for p in ranked[:_MOST_PERIODS]
    )
    columns = (
        Column("Kind"),
        Column("Phase"),
        Column("From", "time"),
        Column("To", "time"),
        Column("Hours", "num"),
        Column("Worst", "num"),
        Column("Mean", "num"),
        Column("Energy, kWh", "num"),
        Column("kvarh above target", "num"),
    )
    caption = "Unbroken runs of intervals, the longest first."
    if len(ranked) > len(rows):
        caption += f" The longest {len(rows)} of {len(ranked)} are listed; the time line has all."
    return Table(caption, columns, rows)


def gaps_table(check: Entry) -> Table:
    """Return one row a gap, the longest first."""
    gaps = sorted(
        check.get("gaps") or [],
        key=lambda g: (-int(g.get("missing_intervals") or 0), str(g.get("start"))),
    )
    rows = tuple(
        (when(g.get("start")), when(g.get("end")), number(g.get("missing_intervals"), 0))
        for g in gaps[:_MOST_GAPS]
    )
    caption = "Gaps in the record, the longest first; nothing is filled in."
    if len(gaps) > len(rows):
        caption += f" The longest {len(rows)} of {len(gaps)} are listed."
    return Table(
        caption,
        (Column("From", "time"), Column("To", "time"), Column("Missing intervals", "num")),
        rows,
    )


def notes_of(months: list[Entry]) -> list[str]:
    """Return, once each, the reasons why values of the months cannot be known."""
    notes: dict[str, None] = {}
    for month in months:
        for note in month.get("notes") or []:
            notes.setdefault(f"{month.get('month')}, {note.get('key')}: {note.get('reason')}")
    return list(notes)


def record_words(check: Entry) -> list[tuple[str, str]]:
    """Return the facts of the record itself: term and value."""
    interval = check.get("interval_min")
    return [
        ("Record from", when(check.get("first"))),
        ("Record to", when(check.get("last"))),
        ("Interval", UNKNOWN if interval is None else f"{interval:g} min"),
        ("Completeness", percent(check.get("completeness"))),
    ]
