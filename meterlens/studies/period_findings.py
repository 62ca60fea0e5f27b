"""Findings out of periods: one a kind, with the worst stretch named."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from meterlens.settings import Service
from meterlens.studies.findings import Confidence, Finding, Severity

__all__ = ["period_findings"]

_SEVERITY: dict[str, Severity] = {
    "low-pf": "act",
    "leading": "look",
    "current-imbalance": "look",
    "voltage-imbalance": "look",
    "voltage": "act",
    "overload": "urgent",
}

_NEXT_STEP = {
    "low-pf": "See which load runs in these hours and whether a capacitor bank has dropped out.",
    "leading": "Look for fixed capacitors, filters or cables left on at light load.",
    "current-imbalance": "See which single-phase load runs in these hours; a qualified person "
    "may move it to another phase.",
    "voltage-imbalance": "Compare with a measured line-to-line voltage; if it stands, ask the "
    "utility and spare three-phase motors meanwhile.",
    "voltage": "Check the transformer tap and ask the utility for its own record.",
    "overload": "Have a qualified person check the main breaker, cable and transformer; shift "
    "or shed load before the next such hour.",
}


def period_findings(
    service: Service, periods: list[dict[str, Any]], *, sign_is_assumed: bool
) -> list[Finding]:
    """One finding for each kind of period that occurs.

    Parameters
    ----------
    service : Service
    periods : list of dict
        As `service_periods` gives them.
    sign_is_assumed : bool
        Whether lead or lag is an assumption of the column map.

    Returns
    -------
    list of Finding
    """
    by_kind: dict[str, list[dict[str, Any]]] = {}
    for period in periods:
        by_kind.setdefault(period["kind"], []).append(period)
    findings = [_finding(service, kind, group, sign_is_assumed) for kind, group in by_kind.items()]
    supply = by_kind.get("voltage-imbalance", [])
    return [
        _with_supply(finding) if _happens_in(finding, supply) else finding for finding in findings
    ]


def _happens_in(finding: Finding, supply: list[dict[str, Any]]) -> bool:
    """True for a current imbalance while the voltages are out of balance."""
    return finding.kind == "current-imbalance" and any(
        finding.start < period["end"] and period["start"] < finding.end for period in supply
    )


def _with_supply(finding: Finding) -> Finding:
    return replace(
        finding,
        text=finding.text + " The voltages are out of balance at the same time.",
        next_step="Look at the supply first: uneven voltages make motors' currents uneven.",
    )


def _has_line_voltages(service: Service) -> bool:
    """True where line-to-line magnitudes are metered: they need no assumed angle."""
    columns = service.columns
    return columns is not None and None not in (columns.v_ab, columns.v_bc, columns.v_ca)


def _severity(kind: str, worst: dict[str, Any]) -> Severity:
    """Overload by size and length: a breaker carries a little for a while."""
    if kind == "overload" and worst["worst"] < 1.2 and worst["hours"] < 1.0:
        return "act"
    return _SEVERITY[kind]


def _worst(kind: str, group: list[dict[str, Any]]) -> dict[str, Any]:
    if kind == "voltage":
        return max(group, key=lambda p: abs(p["worst"] - 1.0))
    sign = -1.0 if kind in ("low-pf", "leading") else 1.0
    return max(group, key=lambda p: sign * p["worst"])


def _finding(
    service: Service, kind: str, group: list[dict[str, Any]], sign_is_assumed: bool
) -> Finding:
    worst = _worst(kind, group)
    hours = sum(p["hours"] for p in group)
    often = "in one period" if len(group) == 1 else f"in {len(group)} periods"
    when = worst["worst_start"][:16].replace("T", " ")
    text = _sentence(service, kind, worst, f"{hours:.4g} h {often}", when, group)
    confidence: Confidence = "high"
    if kind == "voltage-imbalance" and not _has_line_voltages(service):
        confidence = "low"
        text += " The voltage angles are assumed 120° apart, so this is an estimate."
    elif kind in ("low-pf", "leading") and sign_is_assumed:
        confidence = "low"
        text += " Lagging or leading is an assumption of the column map, not a measurement."
    return Finding(
        kind=kind,
        service=service.id,
        phase=worst["phase"],
        start=worst["start"],
        end=worst["end"],
        severity=_severity(kind, worst),
        magnitude=worst["worst"],
        unit=worst["unit"],
        confidence=confidence,
        text=text,
        next_step=_NEXT_STEP[kind],
    )


def _sentence(
    service: Service,
    kind: str,
    worst: dict[str, Any],
    total: str,
    when: str,
    group: list[dict[str, Any]],
) -> str:
    size = worst["worst"]
    phase = ""
    if worst["phase"]:
        phase = f" on phase {service.phase_labels['abc'.index(worst['phase'])]}"
    if kind == "low-pf":
        kvarh = sum(p["kvarh_above_target"] for p in group)
        return (
            f"Lagging power factor under {service.target_pf:g} for {total}, lowest {size:.3f} at "
            f"{when}; {kvarh:,.0f} kvarh above target."
        )
    if kind == "leading":
        return f"Leading power factor for {total}, lowest {size:.3f} at {when}."
    if kind == "current-imbalance":
        return (
            f"Phase currents apart for {total}, at most {size:.1%} from their mean{phase} at "
            f"{when}."
        )
    if kind == "voltage-imbalance":
        return f"Voltage imbalance for {total}, at most {size:.2%} at {when}."
    if kind == "voltage":
        low, high = service.voltage_band_pu
        return (
            f"Voltage outside {low:g} to {high:g} of nominal for {total}, {size:.3f} at the "
            f"worst{phase} at {when}."
        )
    return (
        f"Current above the {service.rating_a:g} A rating for {total}, {size:.1%} of it at the "
        f"highest{phase} at {when}."
    )
