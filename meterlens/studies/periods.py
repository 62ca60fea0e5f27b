"""Unbroken runs of intervals that need attention."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from meterlens.electrical.power import power_factor_of_totals
from meterlens.errors import RequestError
from meterlens.settings import PERIOD_KINDS, Service, Site
from meterlens.store.database import Store
from meterlens.studies.site_time import local_iso, refuse_unknown_months

__all__ = ["find_periods", "service_periods"]


def find_periods(
    store: Store, *, kind: str | None = None, months: Sequence[str] = (), service: str | None = None
) -> dict[str, Any]:
    """The result of ``meterlens periods``.

    Parameters
    ----------
    store : Store
    kind : str, optional
        One of `PERIOD_KINDS`; all where left out.
    months : sequence of str
        ``YYYY-MM``; all where empty. A period belongs to the month it starts in.
    service : str, optional
        A service's id; all where left out.

    Returns
    -------
    dict
        ``periods`` and ``notes``.

    Raises
    ------
    RequestError
        No such kind or service, or a month without readings.
    """
    if kind is not None and kind not in PERIOD_KINDS:
        raise RequestError(
            f'there is no kind of period "{kind}"', hint="Kinds: " + ", ".join(PERIOD_KINDS) + "."
        )
    refuse_unknown_months(store, months)
    services = [store.site.service(service)] if service else list(store.site.services)
    periods: list[dict[str, Any]] = []
    wanted: Sequence[str | None] = months or (None,)
    for one in services:
        for month in wanted:
            periods += service_periods(store, one, kind=kind, month=month)
    return {"periods": periods, "notes": []}


def service_periods(
    store: Store, service: Service, *, kind: str | None = None, month: str | None = None
) -> list[dict[str, Any]]:
    """Periods of one service as plain values, in order of start."""
    rows = store.rows("period/of_service", service=service.id, kind=kind, month=month)
    return [_period(store.site, row) for row in rows]


def _period(site: Site, row: dict[str, Any]) -> dict[str, Any]:
    mean = row["mean"]
    if row["kind"] in ("low-pf", "leading"):
        # A power factor is never averaged: it is that of the period's energies.
        mean = power_factor_of_totals(abs(row["net_energy_kwh"]), row["net_reactive_kvarh"])
    return {
        "service": row["service"],
        "kind": row["kind"],
        "phase": row["phase"],
        "start": local_iso(site, row["start_utc"]),
        "end": local_iso(site, row["end_utc"]),
        "worst_start": local_iso(site, row["worst_utc"]),
        "hours": row["hours"],
        "intervals": row["intervals"],
        "worst": row["worst"],
        "mean": mean,
        "unit": row["unit"],
        "energy_kwh": row["energy_kwh"],
        "kvarh_above_target": row["kvarh_above_target"],
    }
