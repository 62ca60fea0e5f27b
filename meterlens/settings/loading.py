"""Finding and reading a site."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from meterlens.errors import SettingsError
from meterlens.settings.key_lines import KeyPath
from meterlens.settings.models import Site, SiteFile
from meterlens.settings.toml_file import TomlFile, read_toml
from meterlens.settings.unsupported import unsupported
from meterlens.settings.wording import reason_and_hint, where, without_echoes

__all__ = ["SITE_FILE", "find_site", "load_site"]

SITE_FILE = "site.toml"

Wrong = tuple[KeyPath, str, str | None]


def find_site(start: Path) -> Path:
    """Find the nearest site.toml, from a folder upward.

    Parameters
    ----------
    start : Path
        The folder to start from.

    Returns
    -------
    Path
        The site.toml file.

    Raises
    ------
    SettingsError
        Where neither the folder nor one above it has a site.toml.
    """
    folder = start.resolve()
    for candidate in (folder, *folder.parents):
        if (candidate / SITE_FILE).is_file():
            return candidate / SITE_FILE
    raise SettingsError(
        f"no {SITE_FILE} in {folder} or above it.",
        hint='"meterlens init DIR" makes a new site; --site DIR names one.',
    )


def load_site(folder: Path | None = None) -> Site:
    """Read a site with its services and their column maps.

    Parameters
    ----------
    folder : Path, optional
        The site's folder, or its site.toml; left out, the nearest one upward from the
        current folder.

    Returns
    -------
    Site

    Raises
    ------
    SettingsError
        Where something in site.toml or in a map file is wrong: the first by line, with
        the file, line and key, and how many more there are.
    """
    written = read_toml(_site_file(folder))
    tables, maps = _with_map_files(written)
    try:
        site_file = SiteFile.model_validate(tables)
    except ValidationError as error:
        faults = without_echoes(error.errors(include_url=False))
        wrong = [(where(each), *reason_and_hint(each)) for each in faults]
        raise _first(written, maps, wrong) from None
    beyond = unsupported(site_file)
    if beyond:
        raise _first(
            written,
            maps,
            [(path, f"not supported by this version: {what}", None) for path, what in beyond],
        )
    return _site(written.path, site_file)


def _site_file(folder: Path | None) -> Path:
    if folder is None:
        return find_site(Path.cwd())
    if folder.is_file():
        return folder.resolve()
    if not folder.is_dir():
        raise SettingsError("no such folder.", file=folder)
    file = folder.resolve() / SITE_FILE
    if not file.is_file():
        raise SettingsError(
            f"no {SITE_FILE} in {folder.resolve()}.",
            hint='"meterlens init DIR" makes a new site.',
        )
    return file


def _site(file: Path, written: SiteFile) -> Site:
    folder = file.parent
    table = written.site
    return Site(
        folder=folder,
        file=file,
        name=table.name,
        timezone=table.timezone,
        store=folder / table.store,
        currency=table.currency,
        limits=table.limits,
        tariff=None if table.tariff is None else folder / table.tariff,
        services=written.service,
        sums=written.sum,
    )


def _with_map_files(written: TomlFile) -> tuple[dict[str, Any], dict[int, TomlFile]]:
    """Put the map files that services name in the place of their names."""
    services = written.tables.get("service")
    if not isinstance(services, list):
        return written.tables, {}
    maps: dict[int, TomlFile] = {}
    read: dict[str, TomlFile] = {}
    filled = list(services)
    for at, service in enumerate(services):
        name = service.get("columns") if isinstance(service, dict) else None
        if isinstance(name, str):
            if name not in read:
                read[name] = _map_file(written, ("service", at, "columns"), name)
            maps[at] = read[name]
            filled[at] = {**service, "columns": read[name].tables}
    return {**written.tables, "service": filled}, maps


def _map_file(written: TomlFile, key: KeyPath, name: str) -> TomlFile:
    path = written.path.parent / name
    if not path.is_file():
        raise SettingsError(
            f'no map file "{name}".',
            file=written.path,
            line=written.line(key),
            key=_dotted(key),
            hint=f"It is looked for as {path}.",
        )
    return read_toml(path)


def _first(written: TomlFile, maps: dict[int, TomlFile], wrong: Iterable[Wrong]) -> SettingsError:
    """Make the error to raise: site.toml before map files, then by line."""
    places: dict[tuple[int, int, str, str], SettingsError] = {}
    for path, reason, hint in wrong:
        file, key, order = written, path, 0
        if path[:1] == ("service",) and path[2:3] == ("columns",) and path[1] in maps:
            # Services that share a map share its errors: each is told once.
            file, key = maps[int(path[1])], path[3:]
            order = 1 + min(at for at, shared in maps.items() if shared is file)
        line = file.line(key)
        dotted = _dotted(key)
        places.setdefault(
            (order, line, dotted, reason),
            SettingsError(f"{reason}.", file=file.path, line=line, key=dotted or None, hint=hint),
        )
    _, error = min(places.items(), key=lambda place: place[0])
    if len(places) > 1:
        more = len(places) - 1
        count = f"({more} more {'error' if more == 1 else 'errors'} after this one.)"
        error.hint = f"{error.hint} {count}" if error.hint else count
    return error


def _dotted(path: KeyPath) -> str:
    return ".".join(part for part in path if isinstance(part, str))
