"""Data quality: how whole the record is, and what in it looks wrong."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from meterlens.settings import Service, map_digest
from meterlens.store.database import Store
from meterlens.studies.findings import Finding, Severity, counted, ranked
from meterlens.studies.flag_findings import flag_findings, mismatch_finding
from meterlens.studies.site_time import local_iso

__all__ = ["check_services", "stale_notes"]


def check_services(store: Store, *, service: str | None = None) -> dict[str, Any]:
    """The result of ``meterlens check``.

    Parameters
    ----------
    store : Store
    service : str, optional
        A service's id; all where left out.

    Returns
    -------
    dict
        ``services``, each with ``first`` (start of the first interval), ``last`` (end of
        the last), ``interval_min``, ``completeness`` (minutes with a total power over
        minutes from first to last), ``gaps`` and ``findings``; and ``notes``.
    """
    services = [store.site.service(service)] if service else list(store.site.services)
    notes = stale_notes(store, services)
    return {
        "services": [_check(store, one, notes) for one in services],
        "notes": notes,
    }


def _check(store: Store, service: Service, notes: list[dict[str, Any]]) -> dict[str, Any]:
    site = store.site
    record = store.rows("check/record", service=service.id)[0]
    if not record["intervals"]:
        notes.append({"key": "first", "service": service.id, "reason": "there are no readings yet"})
        return {
            "service": service.id,
            "first": None,
            "last": None,
            "interval_min": None,
            "completeness": None,
            "gaps": [],
            "findings": [],
        }
    first, last = local_iso(site, record["first_utc"]), local_iso(site, record["last_utc"])
    minutes = (record["last_utc"] - record["first_utc"]).total_seconds() / 60.0
    gaps = [
        {
            "start": local_iso(site, row["start_utc"]),
            "end": local_iso(site, row["end_utc"]),
            "missing_intervals": row["missing_intervals"],
        }
        for row in store.rows("check/gap", service=service.id)
    ]
    findings = [
        *_gap_findings(service, gaps),
        *_missing_power(store, service),
        *mismatch_finding(store, service),
        *_file_findings(store, service, first, last),
        *flag_findings(store, service),
    ]
    return {
        "service": service.id,
        "first": first,
        "last": last,
        "interval_min": record["interval_min"],
        "completeness": record["minutes_with_p"] / minutes,
        "gaps": gaps,
        "findings": ranked(findings),
    }


def _gap_findings(service: Service, gaps: list[dict[str, Any]]) -> list[Finding]:
    if not gaps:
        return []
    longest = max(gaps, key=lambda gap: gap["missing_intervals"])
    missing = sum(gap["missing_intervals"] for gap in gaps)
    when = longest["start"][:16].replace("T", " ")
    count = counted(len(gaps), "gap")
    return [
        Finding(
            kind="gap",
            service=service.id,
            phase=None,
            start=longest["start"],
            end=longest["end"],
            severity="look",
            magnitude=float(missing),
            unit="intervals",
            confidence="high",
            text=f"{count}, {counted(missing, 'interval')} missing in all; the longest, "
            f"{counted(longest['missing_intervals'], 'interval')}, begins {when}.",
            next_step="Export these days from the meter again and ingest the file.",
        )
    ]


def stale_notes(store: Store, services: Sequence[Service]) -> list[dict[str, Any]]:
    """Which services have files that were read under an earlier column map."""
    notes = []
    for service in services:
        current = map_digest(store.site, service)
        stale = sum(
            row["files"]
            for row in store.rows("check/stale_file", service=service.id)
            if row["map_digest"] != current
        )
        if stale:
            files = "1 file was" if stale == 1 else f"{stale} files were"
            notes.append(
                {
                    "key": "columns",
                    "service": service.id,
                    "reason": f"{files} read under an earlier column map or time zone: run "
                    "meterlens ingest to read them as the site says now",
                }
            )
    return notes


def _missing_power(store: Store, service: Service) -> list[Finding]:
    """Intervals that are there but have no total power."""
    runs = store.rows("check/missing_power", service=service.id)
    if not runs:
        return []
    site = store.site
    longest = max(runs, key=lambda run: run["intervals"])
    count = sum(run["intervals"] for run in runs)
    start = local_iso(site, longest["start_utc"])
    when = start[:16].replace("T", " ")
    return [
        Finding(
            kind="power-missing",
            service=service.id,
            phase=None,
            start=start,
            end=local_iso(site, longest["end_utc"]),
            severity="look",
            magnitude=float(count),
            unit="intervals",
            confidence="high",
            text=f"{counted(count, 'interval')} in the record without a total power, for want of a "
            "value of a loaded phase; the longest run, "
            f"{counted(longest['intervals'], 'interval')}, begins {when}.",
            next_step="See the blank and rejected values there; export them again.",
        )
    ]


def _file_findings(store: Store, service: Service, first: str, last: str) -> list[Finding]:
    """Rows that were repeated, corrected or not readable, by what the files said."""
    files = store.rows("check/file_outcome", service=service.id)
    wording: tuple[tuple[str, str, Severity, str, str, str], ...] = (
        (
            "duplicate",
            "rows_duplicate",
            "note",
            "row",
            "repeated what is stored already and changed nothing.",
            "Nothing to do; overlapping exports are safe.",
        ),
        (
            "replaced",
            "rows_replaced",
            "look",
            "row",
            "changed a stored value; the earlier values are in the view history.",
            "See whether the meter or the utility corrected these readings.",
        ),
        (
            "rejected",
            "rows_rejected",
            "look",
            "row",
            "could not be read; the view reject has each line and reason.",
            'Run meterlens query "select * from reject", correct the export or the column map.',
        ),
        (
            "impossible-value",
            "values_rejected",
            "look",
            "impossible value",
            "left blank; the view reject has each.",
            'Run meterlens query "select * from reject where column is not null".',
        ),
    )
    findings = []
    for kind, key, severity, noun, text, step in wording:
        count = sum(row[key] for row in files)
        if count:
            findings.append(
                Finding(
                    kind=kind,
                    service=service.id,
                    phase=None,
                    start=first,
                    end=last,
                    severity=severity,
                    magnitude=float(count),
                    unit="values" if key == "values_rejected" else "rows",
                    confidence="high",
                    text=f"{counted(count, noun)} {text}",
                    next_step=step,
                )
            )
    return findings
