"""Why a figure of a month cannot be known, and what a figure leans on."""

from __future__ import annotations

from typing import Any

from meterlens.settings import Service

__all__ = ["month_notes"]

_NEEDS_P = ("energy_kwh", "energy_export_kwh")
_NEEDS_Q = (
    "reactive_lagging_kvarh",
    "reactive_leading_kvarh",
    "apparent_kvah",
    "low_pf_hours",
    "leading_hours",
    "kvarh_above_target",
)
_NEEDS_WINDOW = ("peak_demand_kw", "peak_demand_start", "load_factor")
_NEEDS_Q_WINDOW = ("peak_demand_kva", "peak_demand_kva_start", "pf_at_peak")
_NEEDS_COLUMN = {
    "peak_current_a": "no phase currents",
    "peak_current_phase": "no phase currents",
    "peak_current_utilisation": "no phase currents",
    "neutral_current_max_a": "no phase currents with their angles",
    "voltage_min_pu": "no line-to-neutral voltages",
    "voltage_max_pu": "no line-to-neutral voltages",
    "hours_outside_voltage_band": "no line-to-neutral voltages",
    "vuf_p95": "no loaded interval with three voltages",
    "lvur_p95": "no loaded interval with three voltages",
    "current_unbalance_p95": "no loaded interval with three currents",
}


def month_notes(
    service: Service,
    month: str,
    entry: dict[str, Any],
    row: dict[str, Any],
    peak: dict[str, Any] | None,
    interval_min: int,
) -> list[dict[str, Any]]:
    """Notes on one month of one service.

    Parameters
    ----------
    service : Service
    month : str
    entry : dict
        The month's figures.
    row : dict
        The month's sums.
    peak : dict or None
        The window of the kW peak.
    interval_min : int
        The record's commonest interval, minutes.

    Returns
    -------
    list of dict
        Each with ``key``, ``service``, ``month``, ``reason``.
    """
    reasons = _unknown(service, entry, row, interval_min)
    if peak is not None and peak["window_min"] > service.demand_window_min:
        factor = peak["window_min"] / service.demand_window_min
        reasons["peak_demand_kw"] = (
            f"the record has {peak['window_min']}-minute intervals: the highest "
            f"{service.demand_window_min}-minute demand lies between {peak['p_kw']:.6g} and "
            f"{factor * peak['p_kw']:.6g} kW"
        )
    if 0 < row["minutes_with_q"] < row["minutes_with_p"]:
        share = row["minutes_with_q"] / row["minutes_with_p"]
        reasons.setdefault(
            "reactive_lagging_kvarh",
            f"reactive power is known for {share:.1%} of the time with power",
        )
    return [
        {"key": key, "service": service.id, "month": month, "reason": reason}
        for key, reason in reasons.items()
    ]


def _unknown(
    service: Service, entry: dict[str, Any], row: dict[str, Any], interval_min: int
) -> dict[str, str]:
    no_p = "the record has no total power (P) in this month"
    no_q = "the record has no total reactive power (Q) in this month"
    has_p, has_q = row["minutes_with_p"] > 0, row["minutes_with_q"] > 0
    window = f"no {service.demand_window_min}-minute window of the month is complete"
    if service.demand_window_min % interval_min and interval_min < service.demand_window_min:
        window = (
            f"the {service.demand_window_min}-minute demand window is no multiple of the "
            f"record's {interval_min}-minute intervals: set demand_window_min"
        )
    reasons = dict.fromkeys(_NEEDS_P, no_p) | dict.fromkeys(_NEEDS_Q, no_q)
    reasons |= dict.fromkeys(_NEEDS_WINDOW, window if has_p else no_p)
    reasons |= dict.fromkeys(_NEEDS_Q_WINDOW, window if has_q else no_q)
    reasons["pf_energy_weighted"] = "there is neither energy nor reactive energy" if has_q else no_q
    for key, what in _NEEDS_COLUMN.items():
        reasons[key] = f"the record has {what} in this month"
    return {key: reason for key, reason in reasons.items() if entry[key] is None}
