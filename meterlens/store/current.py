"""Opening a store whose derived values are known to be of today's settings and formulas."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager

from meterlens.settings import Site
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
        current = settings_are_current(store)
    if not current:
        with open_store(site, write=True) as store:
            derived = refresh(store)
        if derived:
            tell(
                f"settings or formulas changed: derived {', '.join(derived)} anew from its "
                "stored readings"
            )
    with open_store(site) as store:
        yield store
