"""Instants of the store (naive UTC) as the site's own time."""

from __future__ import annotations

from datetime import UTC, datetime

from meterlens.settings import Site
from meterlens.store.zones import site_zone

__all__ = ["local_iso", "month_of"]


def local_iso(site: Site, utc: datetime) -> str:
    """Site-local ISO 8601 with offset and seconds."""
    local = utc.replace(tzinfo=UTC).astimezone(site_zone(site.timezone))
    return local.isoformat(timespec="seconds")


def month_of(site: Site, utc: datetime) -> str:
    """Calendar month of an instant in site time, ``YYYY-MM``."""
    return local_iso(site, utc)[:7]
