"""Commands that answer questions: check, review, periods, dashboard."""

from __future__ import annotations

import re
from pathlib import Path

import click

from meterlens.cli import study_tables
from meterlens.cli.console import phase_labels, print_json, say, site_options, tell
from meterlens.settings import PERIOD_KINDS, Site

__all__ = ["check", "dashboard", "periods", "review"]

_MONTH = re.compile(r"\d{4}-(0[1-9]|1[0-2])")


def _months(ctx: click.Context, parameter: click.Parameter, texts: tuple[str, ...]) -> list[str]:
    del ctx, parameter
    for text in texts:
        if not _MONTH.fullmatch(text):
            raise click.BadParameter(f"{text!r} is not a month like 2026-11")
    return sorted(set(texts))


_month_option = click.option(
    "--month",
    "months",
    multiple=True,
    metavar="YYYY-MM",
    callback=_months,
    help="A calendar month in site time; repeat for several. All when left out.",
)
_service_option = click.option("--service", "service_id", metavar="ID", help="One service only.")


@click.command()
@_service_option
@site_options
def check(site: Site, as_json: bool, service_id: str | None) -> None:
    """Look at the quality of the record: gaps, completeness, repeats, rejects."""
    from meterlens.store.current import open_current_store
    from meterlens.studies.check import check_services

    with open_current_store(site, tell) as store:
        result = check_services(store, service=service_id)
    if as_json:
        print_json(result)
    else:
        study_tables.print_check(result)


@click.command()
@_month_option
@_service_option
@site_options
def review(site: Site, as_json: bool, months: list[str], service_id: str | None) -> None:
    """Review each month: energy, demand, power factor, imbalance, what needs attention."""
    from meterlens.store.current import open_current_store
    from meterlens.studies.review import review_months

    with open_current_store(site, tell) as store:
        result = review_months(store, months=months, service=service_id)
    if as_json:
        print_json(result)
    else:
        study_tables.print_review(result)


@click.command()
@click.option("--kind", type=click.Choice(PERIOD_KINDS), help="One kind only.")
@_month_option
@_service_option
@site_options
def periods(
    site: Site, as_json: bool, kind: str | None, months: list[str], service_id: str | None
) -> None:
    """List the periods that need attention."""
    from meterlens.store.current import open_current_store
    from meterlens.studies.periods import find_periods

    with open_current_store(site, tell) as store:
        result = find_periods(store, kind=kind, months=months, service=service_id)
    if as_json:
        print_json(result)
    else:
        study_tables.print_periods(result, phase_labels(site))


@click.command()
@click.option(
    "--out",
    type=click.Path(path_type=Path, file_okay=False),
    metavar="DIR",
    help="Folder of the pages; the site's reports folder when left out.",
)
@click.option("--single-file", is_flag=True, help="Put the chart library into each page.")
@site_options
def dashboard(site: Site, as_json: bool, out: Path | None, single_file: bool) -> None:
    """Write the static pages: an index and one page a service."""
    from meterlens.cli.pages import write_dashboard

    folder = out or site.folder / "reports"
    files = write_dashboard(site, folder, single_file=single_file)
    if as_json:
        print_json({"files": [str(file) for file in files], "notes": []})
        return
    say(f"Wrote {len(files)} files; open {files[0]}")
