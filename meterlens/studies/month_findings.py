"""What a month's figures call attention to, beside its periods."""

from __future__ import annotations

from typing import Any

from meterlens.limits import CONTINUOUS_FRACTION
from meterlens.settings import Service
from meterlens.store.database import Store
from meterlens.store.setting_rows import month_bounds
from meterlens.studies.findings import Finding
from meterlens.studies.period_findings import period_findings
from meterlens.studies.site_time import local_iso

__all__ = ["CONTINUOUS_HOURS", "month_findings"]

#: Load that lasts this long is continuous (NFPA 70, article 100; from memory).
CONTINUOUS_HOURS = 3.0


def month_findings(
    store: Store,
    service: Service,
    entry: dict[str, Any],
    periods: list[dict[str, Any]],
    longest: dict[str, Any] | None,
    *,
    sign_is_assumed: bool,
    demand_note: str | None,
) -> list[Finding]:
    """Findings of one month of one service.

    Parameters
    ----------
    store : Store
    service : Service
    entry : dict
        The month's figures.
    periods : list of dict
        Periods that start in the month.
    longest : dict or None
        The longest run above the continuous share of the rating.
    sign_is_assumed : bool
        Whether lead or lag leans on an assumption anywhere in the record.
    demand_note : str or None
        Why there is no demand although there is power.

    Returns
    -------
    list of Finding
    """
    start, end = (
        local_iso(store.site, instant.replace(tzinfo=None))
        for instant in month_bounds(store.site.timezone, entry["month"])
    )
    findings = period_findings(service, periods, sign_is_assumed=sign_is_assumed)
    findings += _incomplete(service, entry, start, end)
    findings += _continuous(store, service, longest)
    if demand_note is not None:
        findings.append(
            Finding(
                kind="demand-unknown",
                service=service.id,
                phase=None,
                start=start,
                end=end,
                severity="act",
                magnitude=None,
                unit="kW",
                confidence="high",
                text=f"There is no demand figure: {demand_note}.",
                next_step="Set the window that the bill uses, or export finer intervals.",
            )
        )
    return findings


def _incomplete(service: Service, entry: dict[str, Any], start: str, end: str) -> list[Finding]:
    missing = 1.0 - entry["completeness"]
    if missing < 1e-9:
        return []
    text = f"{missing:.2%} of the month has no total power; sums cover the rest only."
    step = "Run meterlens check to see where, and export the missing days again."
    if missing > 0.9:
        text = f"Only {1.0 - missing:.2%} of the month is in the record."
        step = (
            "If the month should hold no more than its first or last interval, see whether the "
            "export stamps the end of each interval: stamp in the column map."
        )
    return [
        Finding(
            kind="incomplete-month",
            service=service.id,
            phase=None,
            start=start,
            end=end,
            severity="look" if missing >= 0.01 else "note",
            magnitude=missing,
            unit="fraction",
            confidence="high",
            text=text,
            next_step=step,
        )
    ]


def _continuous(store: Store, service: Service, longest: dict[str, Any] | None) -> list[Finding]:
    """A run above the continuous share of the rating that lasts as long as counts."""
    if longest is None or longest["minutes"] < 60 * CONTINUOUS_HOURS:
        return []
    share = service.breaker_continuous_percent / 100.0
    hours = longest["minutes"] / 60.0
    begins = local_iso(store.site, longest["start_utc"])
    return [
        Finding(
            kind="continuous-load",
            service=service.id,
            phase=None,
            start=begins,
            end=local_iso(store.site, longest["end_utc"]),
            severity="look",
            magnitude=hours,
            unit="h",
            confidence="high",
            text=f"A phase current stays above {share:.0%} of the {service.rating_a:g} A rating "
            f"for {hours:.4g} h from {begins[:16].replace('T', ' ')}. By common practice load "
            f"of {CONTINUOUS_HOURS:g} h or more stays under {CONTINUOUS_FRACTION.value:.0%} "
            "unless the breaker is marked otherwise.",
            next_step="Have a qualified person check the breaker's marking; see whether load "
            "can be moved to other hours.",
        )
    ]
