"""The site's settings as rows for the store, so that its views stand on their own."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import UTC, datetime, timedelta
from typing import Any

import numpy as np

from meterlens.electrical.conventions import FORMULA_EDITION
from meterlens.electrical.power import tangent_of_power_factor
from meterlens.limits import effective_period_rules
from meterlens.settings import Service, Site, derivation_digest
from meterlens.store.zones import site_zone

__all__ = ["calendar_rows", "month_bounds", "rule_rows", "service_rows"]

#: A ratio this near its limit is on it: 0.95 worked out from three phases is 0.95, and an
#: imbalance stored as a float is its decimal only to seven digits.
_ON_THE_LIMIT = 1e-9
_FLOAT_ROUNDING = 2e-7


def service_rows(site: Site) -> list[dict[str, Any]]:
    """Rows of `service_setting`, one a service."""
    return [_service_row(site, service) for service in site.services]


def _service_row(site: Site, service: Service) -> dict[str, Any]:
    line_to_neutral = service.nominal_voltage_v / float(np.sqrt(3.0))
    low, high = service.voltage_band_pu
    return {
        "service": service.id,
        "name": service.name,
        "timezone": site.timezone,
        "nominal_voltage_v": float(service.nominal_voltage_v),
        "nominal_line_to_neutral_v": line_to_neutral,
        "rating_a": float(service.rating_a),
        "rating_kva": 3.0 * line_to_neutral * service.rating_a / 1000.0,
        "target_pf": float(service.target_pf),
        "tangent_target": float(tangent_of_power_factor(np.array(service.target_pf))),
        "voltage_low_pu": float(low),
        "voltage_high_pu": float(high),
        "demand_window_min": int(service.demand_window_min),
        "demand_kind": service.demand_kind,
        "billing_kva": service.billing_kva,
        "derivation_digest": derivation_digest(site, service, FORMULA_EDITION),
    }


def rule_rows(site: Site) -> list[dict[str, Any]]:
    """Rows of `period_rule`: thresholds on a measure turned so that more is worse."""
    rows = []
    for service in site.services:
        for kind, rule in effective_period_rules(service, site.limits).items():
            if rule.enter_low is not None and rule.enter_high is not None:
                assert rule.leave_low is not None
                enter, leave = 0.0, rule.enter_low - rule.leave_low
            elif rule.enter_low is not None:
                assert rule.leave_low is not None
                enter, leave = -rule.enter_low + _ON_THE_LIMIT, -rule.leave_low + _ON_THE_LIMIT
            else:
                assert rule.enter_high is not None
                assert rule.leave_high is not None
                enter = rule.enter_high * (1.0 + _FLOAT_ROUNDING)
                leave = rule.leave_high * (1.0 + _FLOAT_ROUNDING)
            rows.append(
                {
                    "service": service.id,
                    "kind": kind,
                    "measure": rule.measure,
                    "enter_above": float(enter),
                    "leave_at": float(leave),
                    "minimum_min": float(rule.minimum_min),
                    "load_floor_fraction": float(rule.load_floor_fraction),
                    "unit": rule.unit,
                }
            )
    return rows


def month_bounds(zone_name: str, month: str) -> tuple[datetime, datetime]:
    """First instant of a calendar month in site time and of the next one, in UTC.

    Parameters
    ----------
    zone_name : str
        IANA name.
    month : str
        ``YYYY-MM``.
    """
    year, number = int(month[:4]), int(month[5:7])
    following = (year + number // 12, number % 12 + 1)
    zone = site_zone(zone_name)
    first = datetime(year, number, 1, tzinfo=zone).astimezone(UTC)
    last = datetime(*following, 1, tzinfo=zone).astimezone(UTC)
    return first, last


def calendar_rows(
    zone_name: str, first_utc: datetime, last_utc: datetime
) -> list[Mapping[str, Any]]:
    """Rows of `calendar_month` from the month before the record to the month after it."""
    month = (first_utc.replace(day=1) - timedelta(days=15)).replace(day=1)
    rows: list[Mapping[str, Any]] = []
    while month <= last_utc + timedelta(days=45):
        name = f"{month.year:04d}-{month.month:02d}"
        start, end = month_bounds(zone_name, name)
        rows.append(
            {
                "month": name,
                "start_utc": start.replace(tzinfo=None),
                "end_utc": end.replace(tzinfo=None),
                "minutes": int((end - start).total_seconds() // 60),
            }
        )
        month = (month + timedelta(days=32)).replace(day=1)
    return rows
