"""What needs attention: one shape for all studies, and plain sentences."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any, Literal

__all__ = ["SEVERITIES", "Confidence", "Finding", "Severity", "counted", "ranked"]

Severity = Literal["urgent", "act", "look", "note"]
Confidence = Literal["high", "medium", "low"]

#: Most pressing first.
SEVERITIES: tuple[Severity, ...] = ("urgent", "act", "look", "note")


@dataclass(frozen=True)
class Finding:
    """One thing that needs attention.

    Attributes
    ----------
    kind, service : str
    phase : str or None
    start, end : str
        Site-local ISO 8601.
    severity : str
        ``urgent``, ``act``, ``look`` or ``note``.
    magnitude : float or None
        Its size, in `unit`; `low` and `high` bound it where a range is known.
    cost_per_month : float or None
        In the site's currency; None without a tariff.
    confidence : str
        ``high`` (measured), ``medium`` (leans on an assumption), ``low`` (an estimate).
    text, next_step : str
        Plain sentences.
    """

    kind: str
    service: str
    phase: str | None
    start: str
    end: str
    severity: Severity
    magnitude: float | None
    unit: str
    confidence: Confidence
    text: str
    next_step: str
    low: float | None = None
    high: float | None = None
    cost_per_month: float | None = None

    def as_json(self) -> dict[str, Any]:
        """The finding as plain values."""
        return asdict(self)


def counted(count: int, noun: str) -> str:
    """A number with its noun, in the plural where it is not one."""
    return f"{count:,} {noun}" if count == 1 else f"{count:,} {noun}s"


def ranked(findings: list[Finding]) -> list[dict[str, Any]]:
    """Findings as plain values, most pressing first, then in order of time."""
    ordered = sorted(findings, key=lambda f: (SEVERITIES.index(f.severity), f.start, f.kind))
    return [finding.as_json() for finding in ordered]
