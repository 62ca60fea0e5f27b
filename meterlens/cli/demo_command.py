"""The demo: a made-up site, and everything that is built, run on it."""

from __future__ import annotations

import shutil
from pathlib import Path

import click

from meterlens.cli.console import phase_labels, print_json, say, tell
from meterlens.errors import RequestError
from meterlens.settings import load_site

__all__ = ["demo"]


def demo_folder() -> Path:
    """The shipped demo site: inside the installed package, else beside it."""
    package = Path(__file__).resolve().parent.parent
    inside = package / "demo_data"
    return inside if inside.is_dir() else package.parent / "demo_data"


@click.command()
@click.argument(
    "folder", default="meterlens-demo", type=click.Path(path_type=Path), metavar="[DIR]"
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document.")
def demo(folder: Path, as_json: bool) -> None:
    """Make the demo site in DIR (./meterlens-demo) and go through all that is built."""
    from meterlens.cli import store_commands, study_tables
    from meterlens.cli.pages import write_dashboard
    from meterlens.store.current import open_current_store
    from meterlens.studies.check import check_services
    from meterlens.studies.periods import find_periods
    from meterlens.studies.review import review_months

    copy_demo(folder)
    site = load_site(folder)
    work = [(f, s) for s in site.services for f in store_commands.listed_files(site, s)]
    outcomes, _ = store_commands.ingest_all(site, work)
    with open_current_store(site, tell) as store:
        checked = check_services(store)
        reviewed = review_months(store)
        found = find_periods(store)
    pages = write_dashboard(site, site.folder / "reports", single_file=False)
    if as_json:
        print_json(
            {
                "site": str(folder),
                "ingest": [store_commands.outcome_json(outcome) for outcome in outcomes],
                "check": checked,
                "review": reviewed,
                "periods": found["periods"],
                "pages": [str(page) for page in pages],
                "notes": [],
            }
        )
        return
    say(f"The demo site, {site.name}: invented, with faults planted in it.")
    store_commands.print_ingest(outcomes)
    study_tables.print_check(checked)
    study_tables.print_review(reviewed)
    study_tables.print_periods(found, phase_labels(site))
    say(f"Pages: open {pages[0]}")
    say(f"More:  meterlens periods --site {folder}")


def copy_demo(folder: Path) -> None:
    """Copy the demo's settings and exports; an earlier copy is renewed."""
    source = demo_folder()
    target = folder / "site.toml"
    wanted = (source / "site.toml").read_bytes()
    if target.exists() and target.read_bytes() != wanted:
        raise RequestError(
            "there is another site already", file=target, hint="Name another folder for the demo."
        )
    try:
        (folder / "exports").mkdir(parents=True, exist_ok=True)
        for export in sorted((source / "exports").iterdir()):
            shutil.copyfile(export, folder / "exports" / export.name)
        target.write_bytes(wanted)
    except OSError as error:
        raise RequestError(f"cannot be written ({error.strerror})", file=folder) from None
