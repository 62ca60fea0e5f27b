"""Instants of the store (naive UTC) as the site's own time."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime

from meterlens.errors import RequestError
from meterlens.settings import Site
from meterlens.store.database import Store
from meterlens.store.zones import site_zone

__all__ = ["local_iso", "refuse_unknown_months"]


def local_iso(site: Site, utc: datetime) -> str:
    """Site-local ISO 8601 with offset and seconds."""
    local = utc.replace(tzinfo=UTC).astimezone(site_zone(site.timezone))
    return local.isoformat(timespec="seconds")


def refuse_unknown_months(store: Store, months: Sequence[str]) -> None:
    """Raise RequestError for a month in site time that has no readings."""
    known = [row["month"] for row in store.rows("month/names")]
    for month in months:
        if month not in known:
            raise RequestError(
                f"there are no readings in {month}.", hint="Months: " + ", ".join(known) + "."
            )
