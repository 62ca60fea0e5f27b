"""What a service's page is made from, handed in by the caller: no store is opened here."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any, Final

import polars as pl

__all__ = ["PHASES", "ServiceFacts", "ServicePage"]

PHASES: Final = ("a", "b", "c")


@dataclass(frozen=True)
class ServiceFacts:
    """The settings of a service that its page shows or measures against.

    Attributes
    ----------
    id, name : str
        Key and name of the service.
    connection : str
        ``wye-4w``, ``delta-3w`` or ``delta-4w``.
    timezone : str
        IANA name of the site's zone.
    nominal_voltage_v : float or None
        Line to line, V.
    rating_a : float or None
        Rating of the service per phase, A.
    target_pf : float
        Lagging power factor aimed at, as a fraction.
    voltage_band_pu : tuple of float
        Lowest and highest voltage allowed, per unit of nominal.
    demand_window_min : int
        Length of the demand window, minutes.
    angle_grade : str
        ``measured``, ``triangle`` or ``nominal``.
    current_angle_grade : str
        ``per-phase``, ``shared`` or ``equal``.
    phase_labels : tuple of str
        What people call phases a, b, c.
    high_leg : str or None
        The high phase of a ``delta-4w`` service.
    sense_assumed : bool
        Whether lagging or leading is an assumption of the column map, not measured.
    """

    id: str
    name: str
    connection: str
    timezone: str
    nominal_voltage_v: float | None = None
    rating_a: float | None = None
    target_pf: float = 0.95
    voltage_band_pu: tuple[float, float] = (0.90, 1.10)
    demand_window_min: int = 15
    angle_grade: str = "nominal"
    current_angle_grade: str = "per-phase"
    phase_labels: tuple[str, str, str] = ("a", "b", "c")
    high_leg: str | None = None
    sense_assumed: bool = False


@dataclass(frozen=True)
class ServicePage:
    """Everything one page needs.

    Attributes
    ----------
    service : ServiceFacts
        The settings shown.
    frame : polars.DataFrame
        One row an interval, ordered by ``start_utc``; columns as in the view ``interval``
        and its companions, any of them absent or null.
    months : list of dict
        The service's entries of the ``review`` result, each with its ``month``.
    periods : list of dict
        The service's entries of the ``periods`` result.
    check : dict
        The service's entry of the ``check`` result.
    findings : list of dict
        Findings to show, in the one shape of all results.
    """

    service: ServiceFacts
    frame: pl.DataFrame
    months: list[dict[str, Any]] = field(default_factory=list)
    periods: list[dict[str, Any]] = field(default_factory=list)
    check: dict[str, Any] = field(default_factory=dict)
    findings: list[dict[str, Any]] = field(default_factory=list)
