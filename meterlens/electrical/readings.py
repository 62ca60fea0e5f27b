"""What the kernel is fed: readings of a batch of intervals, and constants of the service."""

from __future__ import annotations

from dataclasses import dataclass

from meterlens.electrical.conventions import FloatArray, PowerFactorSense

__all__ = ["IntervalReadings", "ServiceConstants"]


@dataclass(frozen=True)
class ServiceConstants:
    """What of a service's settings the kernel needs.

    Attributes
    ----------
    sequence : str
        ``abc`` or ``acb``.
    nominal_line_v : float
        Nominal line-to-line voltage, V.
    floor_a : float
        Light-load floor: below this current ratios mean nothing, A.
    power_factor : PowerFactorSense
        How the exported power factor reads.
    mismatch_fraction : float
        Share of S by which metered power may differ from V·I·PF unflagged.
    """

    sequence: str
    nominal_line_v: float
    floor_a: float
    power_factor: PowerFactorSense
    mismatch_fraction: float = 0.02


@dataclass(frozen=True)
class IntervalReadings:
    """Readings in SI units; None where the export has no such column.

    Attributes
    ----------
    v, i, pf, p, q, s : FloatArray or None
        Shape (3, n): line-to-neutral voltage, V; line current, A; power factor as
        printed; metered power, W, var, VA.
    v_line : FloatArray or None
        Shape (3, n): line-to-line voltages ab, bc, ca, V.
    lead_lag : FloatArray or None
        Shape (3, n): +1 lagging, -1 leading, NaN where not told.
    lead_lag_total : FloatArray or None
        Shape (n,): the same, one word for the three phases.
    pf_total, p_total, q_total, s_total : FloatArray or None
        Shape (n,): one value for the three phases.
    """

    v: FloatArray | None = None
    i: FloatArray | None = None
    pf: FloatArray | None = None
    p: FloatArray | None = None
    q: FloatArray | None = None
    s: FloatArray | None = None
    v_line: FloatArray | None = None
    lead_lag: FloatArray | None = None
    lead_lag_total: FloatArray | None = None
    pf_total: FloatArray | None = None
    p_total: FloatArray | None = None
    q_total: FloatArray | None = None
    s_total: FloatArray | None = None

    @property
    def count(self) -> int:
        """Number of intervals n; ValueError where there is no column at all."""
        for x in vars(self).values():
            if x is not None:
                return int(x.shape[-1])
        raise ValueError("readings without any column")
