"""Tables of a page: cells already in words, so that templates only lay them out."""

from __future__ import annotations

from typing import Any, Final

from meterlens.report.facts import PHASES, ServiceFacts
from meterlens.report.sheets import Column, Group, Table
from meterlens.report.words import UNKNOWN, kind_words, number, share, size_words, when

__all__ = ["gaps_table", "notes_of", "periods_table", "phase_name", "record_words"]

_MOST_PERIODS: Final = 60
_MOST_GAPS: Final = 60

Entry = dict[str, Any]


def phase_name(service: ServiceFacts, phase: Any) -> str:
    """Return what people call a phase; empty where there is none."""
    names = dict(zip(PHASES, service.phase_labels, strict=True)) | {"n": "neutral"}
    return "" if phase is None else names.get(str(phase), str(phase))


def periods_table(periods: list[Entry], service: ServiceFacts) -> Table:
    """Return one row a period, the longest first."""
    ranked = sorted(
        periods, key=lambda p: (-float(p.get("hours") or 0), str(p.get("start")), str(p["kind"]))
    )
    rows = tuple(
        (
            kind_words(p.get("kind")),
            phase_name(service, p.get("phase")) or "all",
            when(p.get("start")),
            when(p.get("end")),
            number(p.get("hours"), 2),
            size_words(p.get("kind"), p.get("worst"), p.get("unit")),
            size_words(p.get("kind"), p.get("mean"), p.get("unit")),
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
    caption = (
        "Unbroken runs of intervals, the longest first. Worst and mean are a power factor, a "
        "voltage per unit of nominal (pu), or a share: imbalance, or current over rating."
    )
    if len(ranked) > len(rows):
        caption += f" The longest {len(rows)} of {len(ranked)} are listed; the time line has all."
    return Table("Periods", caption, columns, (Group("", rows),) if rows else ())


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
    columns = (Column("From", "time"), Column("To", "time"), Column("Missing intervals", "num"))
    return Table("Gaps", caption, columns, (Group("", rows),) if rows else ())


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
        ("Data coverage", share(check.get("completeness"))),
    ]
