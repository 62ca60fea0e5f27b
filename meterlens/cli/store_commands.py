"""Commands about the store: init, ingest, query, export."""

from __future__ import annotations

import math
from dataclasses import asdict
from itertools import chain
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from meterlens.cli.console import (
    print_json,
    print_rows,
    print_table,
    progress_over,
    say,
    site_options,
    tell,
)
from meterlens.errors import ExportError, RequestError, SettingsError
from meterlens.settings import Service, Site, write_new_site

if TYPE_CHECKING:
    from meterlens.store.ingest import FileOutcome

__all__ = ["export", "ingest", "ingest_all", "init", "query"]

_SHOWN_REJECTS = 100


@click.command()
@click.argument("folder", type=click.Path(path_type=Path), metavar="DIR")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document.")
def init(folder: Path, as_json: bool) -> None:
    """Make a new site folder DIR with a commented site.toml."""
    path = write_new_site(folder)
    if as_json:
        print_json({"site": str(path), "notes": []})
        return
    say(f"Made {path}")
    say("Next: put exports into its exports folder, edit site.toml to say how they read,")
    say(f"then run: meterlens ingest --site {folder}")


@click.command()
@click.argument("files", nargs=-1, type=click.Path(path_type=Path), metavar="[FILE]...")
@click.option("--service", "service_id", metavar="ID", help="The service the files belong to.")
@site_options
def ingest(site: Site, as_json: bool, files: tuple[Path, ...], service_id: str | None) -> None:
    """Read meter exports into the store.

    Without FILE, each service's own `files` patterns are read. Safe to repeat: a file that
    is in the store already changes nothing.
    """
    work = _work(site, files, service_id)
    outcomes, failures = ingest_all(site, work)
    if not outcomes and failures:
        raise failures[0]
    if as_json:
        print_json(
            {
                "files": [outcome_json(outcome) for outcome in outcomes],
                "notes": [
                    *(
                        {"key": "file", "file": outcome.file, "reason": note}
                        for outcome in outcomes
                        for note in outcome.notes
                    ),
                    *({"key": "file", "file": f.file, "reason": str(f)} for f in failures),
                ],
            }
        )
    else:
        print_ingest(outcomes)
    if failures:
        for failure in failures[1:]:
            tell(str(failure))
        raise failures[0]


def ingest_all(
    site: Site, work: list[tuple[Path, Service]]
) -> tuple[list[FileOutcome], list[ExportError]]:
    """Read files into the store one after another; one that cannot be read stops no other.

    Returns
    -------
    tuple of lists
        What became of the files that were read, and why the others were not.
    """
    from meterlens.store.database import open_store
    from meterlens.store.ingest import ingest_file, refresh

    outcomes: list[FileOutcome] = []
    failures: list[ExportError] = []
    with open_store(site, write=True) as store, progress_over("reading", len(work)) as advance:
        refreshed = refresh(store)
        if refreshed:
            tell(f"settings or formulas changed: derived {', '.join(refreshed)} anew")
        for file, service in work:
            try:
                outcomes.append(ingest_file(store, file, service))
            except ExportError as error:
                failures.append(error)
            advance(file.name)
    return outcomes, failures


def _work(
    site: Site, files: tuple[Path, ...], service_id: str | None
) -> list[tuple[Path, Service]]:
    """Which file is read for which service."""
    chosen = site.service(service_id) if service_id else None
    if files:
        missing = next((f for f in files if not f.exists()), None)
        if missing is not None:
            raise ExportError("no such file", file=missing)
        return [(file, chosen or _owner(site, file)) for file in files]
    services = [chosen] if chosen else list(site.services)
    work = [(file, service) for service in services for file in listed_files(site, service)]
    if not work:
        raise RequestError(
            "no export matches the services' files patterns"
            + "".join(f', "{p}"' for s in services for p in s.files),
            file=site.file,
            key="files",
            hint='Set files = ["exports/*.csv"] for a service, or name the files.',
        )
    return work


def listed_files(site: Site, service: Service) -> list[Path]:
    """The exports that a service's patterns name, in order of name."""
    found: set[Path] = set()
    for pattern in service.files:
        whole = Path(pattern)
        start = Path(whole.anchor) if whole.anchor else site.folder
        try:
            found.update(start.glob(str(whole.relative_to(whole.anchor))))
        except (ValueError, NotImplementedError) as error:
            raise SettingsError(
                f'"{pattern}" is no file pattern ({error})', file=site.file, key="service.files"
            ) from None
    return sorted(path for path in found if path.is_file())


def _owner(site: Site, file: Path) -> Service:
    """The service whose patterns name the file, or the only one there is."""
    if len(site.services) == 1:
        return site.services[0]
    resolved = file.resolve()
    owners = [
        service
        for service in site.services
        if any(resolved == path.resolve() for path in listed_files(site, service))
    ]
    if len(owners) == 1:
        return owners[0]
    ids = ", ".join(service.id for service in site.services)
    raise click.UsageError(f"which service is {file} of? Give --service ID; ids: {ids}")


def outcome_json(outcome: FileOutcome) -> dict[str, Any]:
    """One file's outcome as the interface has it."""
    document: dict[str, Any] = asdict(outcome)
    document.pop("notes")
    document["rejects"] = document["rejects"][:_SHOWN_REJECTS]
    return document


def print_ingest(outcomes: list[FileOutcome]) -> None:
    """A table of files and what became of their rows."""
    headings = ["file", "read", "stored", "replaced", "duplicate", "rejected", "values"]
    keys = ("rows_read", "rows_stored", "rows_replaced", "rows_duplicate", "rows_rejected")
    rows = [
        [
            Path(outcome.file).name,
            *(f"{getattr(outcome, key):,}" for key in keys),
            f"{outcome.values_rejected:,}",
        ]
        for outcome in outcomes
    ]
    print_table("Rows of each export, and single values rejected", headings, rows)
    for outcome in outcomes:
        name = Path(outcome.file).name
        for note in outcome.notes:
            say(f"{name}: {note}")
        for reject in outcome.rejects[:3]:
            column = f" {reject.column}:" if reject.column else ""
            say(f"{name}:{reject.line}:{column} {reject.reason}")
        if len(outcome.rejects) > 3:
            say(f'{name}: and {len(outcome.rejects) - 3} more; see "select * from reject"')


@click.command()
@click.argument("question", metavar="NAME_OR_SQL")
@click.option(
    "--set",
    "settings",
    multiple=True,
    metavar="NAME=VALUE",
    help="A value for a shipped query's $parameter.",
)
@site_options
def query(site: Site, as_json: bool, question: str, settings: tuple[str, ...]) -> None:
    """Ask the store, read-only: a shipped query by name, a view by name, or SQL."""
    from meterlens.store.current import open_current_store
    from meterlens.store.questions import answer

    parameters = dict(_parameter(text) for text in settings)
    with open_current_store(site, tell) as store:
        names, rows = answer(store, question, parameters)
    if as_json:
        finite = [[None if _is_not_finite(x) else x for x in row] for row in rows]
        lost = sum(map(_is_not_finite, chain.from_iterable(rows)))
        notes = [{"key": "rows", "reason": f"{lost} values are not finite numbers"}] if lost else []
        print_json({"columns": names, "rows": finite, "notes": notes})
        return
    print_rows(names, rows)


def _is_not_finite(x: object) -> bool:
    """JSON has no word for infinity or for what is not a number."""
    return isinstance(x, float) and not math.isfinite(x)


def _parameter(text: str) -> tuple[str, str]:
    name, equals, value = text.partition("=")
    if not equals:
        raise click.BadParameter(f"{text!r} is not NAME=VALUE", param_hint="--set")
    return name.strip().lstrip("$"), value


@click.command()
@click.argument("view", metavar="VIEW")
@click.option(
    "--out",
    required=True,
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="File to write: .csv or .parquet.",
)
@site_options
def export(site: Site, as_json: bool, view: str, out: Path) -> None:
    """Write a view of the store to a .csv or .parquet file."""
    from meterlens.store.current import open_current_store
    from meterlens.store.questions import write_view

    with open_current_store(site, tell) as store:
        count = write_view(store, view, out)
    if as_json:
        print_json({"view": view, "file": str(out), "rows": count, "notes": []})
        return
    say(f"Wrote {count:,} rows of {view} to {out}")
