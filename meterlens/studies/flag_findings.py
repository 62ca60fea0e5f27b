"""What the flags of derived values say of a record."""

from __future__ import annotations

from meterlens.limits import POWER_MISMATCH
from meterlens.settings import Service
from meterlens.store.database import Store
from meterlens.studies.findings import Finding, counted
from meterlens.studies.site_time import local_iso

__all__ = ["flag_findings", "mismatch_finding"]

_FLAG_WORDING = {
    "sign-unexpected": (
        "sign-unexpected",
        "with a negative power factor although the column map says unsigned.",
        "Find out what the meter's sign means and set pf_convention.",
    ),
    "q-unknown": (
        "q-unknown",
        "with a reactive power whose sign nothing tells; it is left unknown.",
        "Add a kvar or a lead/lag column to the export.",
    ),
    "lead-lag-assumed": (
        "sign-assumed",
        "with lagging or leading taken from the column map's assumption; a reversed "
        "current transformer or a leading load cannot be seen in them.",
        "Add a kvar or a lead/lag column to the export.",
    ),
    "pf-clamped": (
        "pf-clamped",
        "with a power factor a little above 1, read as 1.",
        "Nothing to do.",
    ),
}


def flag_findings(store: Store, service: Service) -> list[Finding]:
    """One finding for each flag that calls for a word."""
    site = store.site
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
                text=f"{counted(row['intervals'], 'interval')} {text}",
                next_step=step,
            )
        )
    return findings


def mismatch_finding(store: Store, service: Service) -> list[Finding]:
    """Metered power that disagrees with V·I·PF; pressing where it does so throughout."""
    intervals = store.rows("check/record", service=service.id)[0]["intervals"]
    row = next(
        (
            row
            for row in store.rows("check/flag_count", service=service.id)
            if row["flag"] == "power-mismatch"
        ),
        None,
    )
    if row is None:
        return []
    share = row["intervals"] / intervals
    return [
        Finding(
            kind="power-mismatch",
            service=service.id,
            phase=None,
            start=local_iso(store.site, row["first_utc"]),
            end=local_iso(store.site, row["last_utc"]),
            severity="urgent" if share > 0.5 else "look",
            magnitude=share,
            unit="fraction",
            confidence="high",
            text=f"Metered power differs from V·I·PF by more than {POWER_MISMATCH.value:.0%} of "
            f"V·I in {share:.1%} of the intervals.",
            next_step="Before trusting any figure check the column map: scale (W or kW, the "
            "current transformers' ratio), phases, and line-to-line against line-to-neutral."
            if share > 0.5
            else "Check the meter's readings there.",
        )
    ]
