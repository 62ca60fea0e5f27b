"""The table of findings: by month, the most urgent first, whole-record findings last."""

from __future__ import annotations

import json
from typing import Any, Final

from meterlens.report.facts import ServiceFacts, ServicePage
from meterlens.report.sheets import Column, Group, Row, Table
from meterlens.report.tables import phase_name
from meterlens.report.words import UNKNOWN, kind_words, number, percent, size_words, when

__all__ = ["all_findings", "count_words", "findings_table"]

_PRIORITIES: Final = ("urgent", "act", "look", "note")
_COUNTS: Final = {
    "urgent": ("urgent", "urgent"),
    "act": ("to act on", "to act on"),
    "look": ("to look at", "to look at"),
    "note": ("note", "notes"),
}
_WHOLE: Final = "whole record"

Entry = dict[str, Any]


def _print_of(finding: Entry) -> str:
    return json.dumps(finding, sort_keys=True, default=str)


def all_findings(page: ServicePage) -> list[Entry]:
    """Return the page's findings, once each: a review may repeat what a check has said."""
    seen: dict[str, Entry] = {}
    for finding in [*page.findings, *(page.check.get("findings") or [])]:
        seen.setdefault(_print_of(finding), finding)
    return list(seen.values())


def count_words(findings: list[Entry]) -> list[tuple[str, str]]:
    """Return how many findings there are of each priority: its key and the words."""
    priorities = [str(f.get("severity")) for f in findings]
    counts = [(key, priorities.count(key)) for key in _PRIORITIES]
    return [(key, f"{number(n, 0)} {_COUNTS[key][n != 1]}") for key, n in counts if n]


def findings_table(page: ServicePage, currency: str) -> Table:
    """Return one row a finding, under the month it belongs to.

    What the review of a month found belongs to that month, what the check found to the
    whole record; anything else to the month of its start.
    """
    owners: dict[str, str] = {}
    for month in page.months:
        for finding in month.get("findings") or []:
            owners.setdefault(_print_of(finding), str(month.get("month")))
    for finding in page.check.get("findings") or []:
        owners.setdefault(_print_of(finding), _WHOLE)
    findings = all_findings(page)
    costed = any(f.get("cost_per_month") is not None for f in findings)
    grouped: dict[str, list[Entry]] = {}
    for finding in sorted(findings, key=_rank):
        spans = _is_span(finding, page.check.get("first"), page.check.get("last"))
        fallback = _WHOLE if spans else when(finding.get("start"))[:7]
        grouped.setdefault(owners.get(_print_of(finding), fallback), []).append(finding)
    # Months from the newest; words come before digits, so the whole record is put last.
    order = sorted((key for key in grouped if key != _WHOLE), reverse=True)
    order += [_WHOLE] if _WHOLE in grouped else []
    groups = tuple(
        Group(
            key[:1].upper() + key[1:],
            tuple(_row(f, key, page, costed=costed) for f in grouped[key]),
        )
        for key in order
    )
    columns = [
        Column("Priority"),
        Column("Finding"),
        Column("What the readings show", "long"),
        Column("When", "time"),
        Column("Size", "num"),
        *([Column(f"{currency} a month", "num")] if costed else []),
        Column("Confidence"),
        Column("Next step", "long"),
    ]
    caption = (
        "Months from the newest; in each the most pressing first: urgent, act, look, note. "
        "Confidence is high where the finding is measured, lower where it leans on an assumption."
    )
    return Table("Findings", caption, tuple(columns), groups, stacked=True)


def _rank(finding: Entry) -> tuple[int, float, str, str, str]:
    severity = str(finding.get("severity"))
    return (
        _PRIORITIES.index(severity) if severity in _PRIORITIES else len(_PRIORITIES),
        -float(finding.get("cost_per_month") or 0),
        str(finding.get("start") or ""),
        str(finding.get("kind")),
        str(finding.get("phase") or ""),
    )


def _is_span(finding: Entry, first: Any, last: Any) -> bool:
    """Tell whether a finding covers everything from `first` to `last`."""
    if UNKNOWN in (when(first), when(last)):
        return False
    start, end = when(finding.get("start")), when(finding.get("end"))
    return start <= when(first) and end != UNKNOWN and end >= when(last)


def _span_words(finding: Entry, group: str, check: Entry) -> str:
    start, end = when(finding.get("start")), when(finding.get("end"))
    if group == _WHOLE and _is_span(finding, check.get("first"), check.get("last")):
        return _WHOLE
    if start.startswith(f"{group}-01 00:00") and end.endswith("-01 00:00") and end != start:
        return "whole month"
    if end == UNKNOWN:
        return start
    return f"{start} to\n{end}"


def _row(finding: Entry, group: str, page: ServicePage, *, costed: bool) -> Row:
    service: ServiceFacts = page.service
    kind, unit = finding.get("kind"), finding.get("unit")
    size = size_words(kind, finding.get("magnitude"), unit)
    low, high = finding.get("low"), finding.get("high")
    if low is not None and high is not None:
        size += f"\n{size_words(kind, low, unit)} to\n{size_words(kind, high, unit)}"
    topic, phase = kind_words(kind), phase_name(service, finding.get("phase"))
    return (
        str(finding.get("severity") or ""),
        f"{topic}, {phase}" if phase else topic,
        str(finding.get("text") or ""),
        _span_words(finding, group, page.check),
        size,
        *([number(finding.get("cost_per_month"), 0)] if costed else []),
        _confidence(finding.get("confidence")),
        str(finding.get("next_step") or ""),
    )


def _confidence(value: Any) -> str:
    if value is None:
        return UNKNOWN
    return percent(value, 0) if isinstance(value, int | float) else str(value)
