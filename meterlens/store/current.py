"""Opening a store whose derived values are known to be of today's settings and formulas."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager

from meterlens.settings import Site, map_digest
from meterlens.store.database import Store, open_store, settings_are_current
from meterlens.store.ingest import refresh

__all__ = ["open_current_store"]


@contextmanager
def open_current_store(site: Site, tell: Callable[[str], None]) -> Iterator[Store]:
    """Open a store for reading, deriving anew what is stale.

    Parameters
    ----------
    site : Site
    tell : callable
        Takes a sentence for the user where something was derived anew.

    Raises
    ------
    StoreError
        There is no store, or it is stale and cannot be written.
    """
    with open_store(site) as store:
        if settings_are_current(store):
            _tell_stale(store, tell)
            yield store
            return
    with open_store(site, write=True) as store:
        derived = refresh(store)
    if derived:
        tell(
            f"settings or formulas changed: derived {', '.join(derived)} anew from stored readings"
        )
    with open_store(site) as store:
        _tell_stale(store, tell)
        yield store


def _tell_stale(store: Store, tell: Callable[[str], None]) -> None:
    """Say where readings were read under an earlier column map."""
    for service in store.site.services:
        digest = map_digest(store.site, service)
        rows = store.rows("check/stale_file", service=service.id)
        if any(row["map_digest"] != digest for row in rows):
            tell(
                f"the column map or time zone of {service.id} changed since its files were "
                "read: run meterlens ingest to read them as the site says now"
            )
