"""Hands each service's record and results to the pages."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from meterlens import __version__
from meterlens.cli.console import progress_over, tell
from meterlens.report.facts import ServiceFacts, ServicePage
from meterlens.report.pages import write_pages
from meterlens.settings import Service, Site
from meterlens.store.current import open_current_store
from meterlens.store.database import Store
from meterlens.studies.check import check_services
from meterlens.studies.periods import service_periods
from meterlens.studies.review import review_months

__all__ = ["write_dashboard"]


def write_dashboard(site: Site, out: Path, *, single_file: bool) -> list[Path]:
    """Write the pages of a site; returns the files, the index first."""
    with (
        open_current_store(site, tell) as store,
        progress_over("drawing", len(site.services)) as advance,
    ):

        def pages() -> Iterator[ServicePage]:
            for service in site.services:
                yield service_page(store, service)
                advance(service.id)

        return write_pages(
            site.name,
            site.currency,
            pages(),
            out,
            version=__version__,
            single_file=single_file,
        )


def service_page(store: Store, service: Service) -> ServicePage:
    """All that one service's page shows."""
    site = store.site
    checked = check_services(store, service=service.id)["services"][0]
    reviewed = review_months(store, service=service.id)
    months = [
        {
            "month": month["month"],
            "notes": [n for n in reviewed["notes"] if n.get("month") == month["month"]],
        }
        | month["services"][0]
        for month in reviewed["months"]
    ]
    grades = store.rows("interval/angle_grade", service=service.id)
    first = grades[0] if grades else {"angle_grade": "nominal", "current_angle_grade": "equal"}
    facts = ServiceFacts(
        id=service.id,
        name=service.name,
        phase_labels=service.phase_labels,
        rating_a=service.rating_a,
        nominal_voltage_v=service.nominal_voltage_v,
        target_pf=service.target_pf,
        voltage_band_pu=service.voltage_band_pu,
        demand_window_min=service.demand_window_min,
        angle_grade=first["angle_grade"],
        current_angle_grade=first["current_angle_grade"],
        timezone=site.timezone,
        connection=service.connection,
        sense_assumed=service.columns is not None and service.columns.assume is not None,
    )
    findings = [f for month in months for f in month["findings"]]
    return ServicePage(
        service=facts,
        frame=store.frame("interval/page_series", service=service.id),
        months=months,
        periods=service_periods(store, service),
        check=checked,
        findings=findings + checked["findings"],
    )
