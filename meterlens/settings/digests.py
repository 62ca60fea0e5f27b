"""Fingerprints of settings: they tell when stored rows no longer fit what a site says."""

from __future__ import annotations

import hashlib
import json

from meterlens.settings.models import Service, Site

__all__ = ["derivation_digest", "map_digest"]

_SERVICE_KEYS = {
    "connection",
    "phase_sequence",
    "high_leg",
    "nominal_voltage_v",
    "rating_a",
    "light_load_fraction",
}
_COLUMN_KEYS = {
    "pf_convention",
    "pf_unit",
    "pf_kind",
    "assume",
    "lagging_sign",
    "total_pf_kind",
    "meter_elements",
}


def map_digest(site: Site, service: Service) -> str:
    """Fingerprint all that changes how a file is read into stored readings.

    Parameters
    ----------
    site : Site
        Its time zone counts.
    service : Service
        Its id and its whole column map count.

    Returns
    -------
    str
        64 hexadecimal digits.

    Notes
    -----
    A key that is left out counts as its default. Keys without a value are left out, so
    that a later version's new optional keys do not make every stored file look changed.
    """
    columns = service.columns
    return _digest(
        {
            "service": service.id,
            "timezone": site.timezone,
            "columns": columns and columns.model_dump(mode="json", exclude_none=True),
        }
    )


def derivation_digest(site: Site, service: Service, formula_edition: str) -> str:
    """Fingerprint all that changes the derived values of stored readings.

    Parameters
    ----------
    site : Site
        Its time zone counts.
    service : Service
        What the formulas use of it counts; its name, limits and files do not.
    formula_edition : str
        The edition of the formulas.

    Returns
    -------
    str
        64 hexadecimal digits.
    """
    columns = service.columns
    return _digest(
        {
            "formula_edition": formula_edition,
            "timezone": site.timezone,
            "service": service.model_dump(mode="json", include=_SERVICE_KEYS),
            "columns": columns and columns.model_dump(mode="json", include=_COLUMN_KEYS),
        }
    )


def _digest(content: dict[str, object]) -> str:
    canonical = json.dumps(content, sort_keys=True, separators=(",", ":"), allow_nan=False)
    return hashlib.sha256(canonical.encode("ascii")).hexdigest()
