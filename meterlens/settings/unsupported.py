"""What a site may say already, and this version cannot do yet.

One function an entry: when a version learns something, its entry goes.
"""

from __future__ import annotations

from collections.abc import Iterator

from meterlens.settings.column_map import ColumnMap
from meterlens.settings.key_lines import KeyPath
from meterlens.settings.models import Service, SiteFile

__all__ = ["unsupported"]

Unsupported = tuple[KeyPath, str]


def unsupported(site: SiteFile) -> list[Unsupported]:
    """List the settings that this version understands but cannot honour.

    Parameters
    ----------
    site : SiteFile
        A valid site.

    Returns
    -------
    list of (tuple of str or int, str)
        The key's path from the top of site.toml, and what is not supported.
    """
    found: list[Unsupported] = [(("sum", at), "sums of services") for at in range(len(site.sum))]
    for at, service in enumerate(site.service):
        own: KeyPath = ("service", at)
        found += [((*own, *path), what) for path, what in _of_service(service)]
        if service.columns is not None:
            own = (*own, "columns")
            found += [((*own, *path), what) for path, what in _of_columns(service.columns)]
    return found


def _of_service(service: Service) -> Iterator[Unsupported]:
    if service.connection != "wye-4w":
        yield ("connection",), f'connection = "{service.connection}"'


def _of_columns(columns: ColumnMap) -> Iterator[Unsupported]:
    for key in (*columns.value_columns(), *columns.text_columns()):
        if key.startswith(("energy_", "reactive_")):
            yield (key,), "energies metered per interval"
        if key.startswith("register_"):
            yield (key,), "cumulative registers"
        if key.startswith("thd_"):
            yield (key,), "harmonic distortion columns"
        if key.startswith("angle_"):
            yield (key,), "angle columns"
        if key.startswith("quadrant_"):
            yield (key,), "quadrant columns"
        if key == "service":
            yield (key,), "several services in one file"
    if columns.pf_convention in ("quadrant", "suffix"):
        yield ("pf_convention",), f'pf_convention = "{columns.pf_convention}"'
    if columns.meter_elements == 2:
        yield ("meter_elements",), "two-element meters"
    if columns.midnight == "ends-day":
        yield ("midnight",), 'midnight = "ends-day"'
