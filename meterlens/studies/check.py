"""Data quality: how whole the record is, and what in it looks wrong."""

from __future__ import annotations

from typing import Any

from meterlens.settings import Service, Site
from meterlens.store.database import Store
from meterlens.studies.findings import Finding, ranked
from meterlens.studies.site_time import local_iso

__all__ = ["check_services", "service_coverage"]


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
    notes: list[dict[str, Any]] = []
    return {
        "services": [_check(store, one, notes) for one in services],
        "notes": notes,
    }


def service_coverage(store: Store, service: Service) -> list[dict[str, Any]]:
    """Minutes present, and minutes with a total power, of each local day."""
    return [
        {
            "day": row["day"].isoformat(),
            "minutes_present": row["minutes_present"],
            "minutes_with_p": row["minutes_with_p"],
        }
        for row in store.rows("check/coverage", service=service.id)
    ]


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
        *_file_findings(store, service, first, last),
        *_flag_findings(store, site, service),
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
    count = "1 gap" if len(gaps) == 1 else f"{len(gaps)} gaps"
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
            text=f"{count}, {missing} intervals missing in all; the longest, "
            f"{longest['missing_intervals']} intervals, begins {when}.",
            next_step="Export these days from the meter again and ingest the file.",
        )
    ]


def _file_findings(store: Store, service: Service, first: str, last: str) -> list[Finding]:
    """Rows that were repeated, corrected or not readable, by what the files said."""
    files = store.rows("check/file_outcome", service=service.id)
    wording = (
        (
            "duplicate",
            "rows_duplicate",
            "note",
            "rows say again what is stored; they change nothing.",
            "Nothing to do; overlapping exports are safe.",
        ),
        (
            "replaced",
            "rows_replaced",
            "look",
            "rows changed a stored value; the earlier values are in the view history.",
            "See whether the meter or the utility corrected these readings.",
        ),
        (
            "rejected",
            "rows_rejected",
            "look",
            "rows could not be read; the view reject has each line and reason.",
            'Run meterlens query "select * from reject", mend the export or the column map.',
        ),
        (
            "impossible-value",
            "values_rejected",
            "look",
            "single values cannot be and are left blank; the view reject has each.",
            'Run meterlens query "select * from reject where column is not null".',
        ),
    )
    findings = []
    for kind, key, severity, text, step in wording:
        count = sum(row[key] for row in files)
        if count:
            findings.append(
                Finding(
                    kind=kind,
                    service=service.id,
                    phase=None,
                    start=first,
                    end=last,
                    severity="note" if severity == "note" else "look",
                    magnitude=float(count),
                    unit="values" if key == "values_rejected" else "rows",
                    confidence="high",
                    text=f"{count} {text}",
                    next_step=step,
                )
            )
    return findings


_FLAG_WORDING = {
    "sign-unexpected": (
        "sign-unexpected",
        "intervals print a negative power factor although the column map says unsigned.",
        "Find out what the meter's sign means and set pf_convention.",
    ),
    "power-mismatch": (
        "power-mismatch",
        "intervals have a metered power that differs from V·I·PF by more than 2 % of S.",
        "Check the column map: phases, scale, and which power each column holds.",
    ),
    "q-unknown": (
        "q-unknown",
        "intervals have a reactive power whose sign nothing tells; it is left unknown.",
        "Add a kvar or a lead/lag column to the export.",
    ),
    "lead-lag-assumed": (
        "sign-assumed",
        "intervals take lagging or leading from the column map's assumption; a reversed "
        "current transformer or a leading load cannot be seen in them.",
        "Add a kvar or a lead/lag column to the export.",
    ),
    "pf-clamped": (
        "pf-clamped",
        "intervals print a power factor a little above 1, read as 1.",
        "Nothing to do.",
    ),
}


def _flag_findings(store: Store, site: Site, service: Service) -> list[Finding]:
    findings = []
    for row in store.rows("check/flag_count", service=service.id):
        if row["flag"] not in _FLAG_WORDING:
            continue
        kind, text, step = _FLAG_WORDING[row["flag"]]
        harmless = row["flag"] == "pf-clamped"
        findings.append(
            Finding(
                kind=kind,
                service=service.id,
                phase=None,
                start=local_iso(site, row["first_utc"]),
                end=local_iso(site, row["last_utc"]),
                severity="note" if harmless else "look",
                magnitude=float(row["intervals"]),
                unit="intervals",
                confidence="high",
                text=f"{row['intervals']} {text}",
                next_step=step,
            )
        )
    return findings
