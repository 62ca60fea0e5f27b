"""Tidier exports that make the other choices: newest first, UTC and ISO, date and time apart.

Each builds a site and returns the same `Export` as the awkward one.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from zoneinfo import ZoneInfo

import awkward_export
from plain_power import Service
from plain_reader import ExportMap
from planted_load import (
    Export,
    Line,
    Planted,
    body_of,
    local_start,
    run_of,
    site_toml,
    write_site,
)


def _columns(
    stamps: tuple[str, ...], extra: tuple[str, ...] = ()
) -> tuple[tuple[str, str, str], ...]:
    keys = ("v_a", "v_b", "v_c", "i_a", "i_b", "i_c", "pf_a", "pf_b", "pf_c", *extra)
    named = tuple((key, key.upper().replace("_", " "), "") for key in keys)
    return (*(("timestamp", stamp, "") for stamp in stamps), *named)


NEWEST_FIRST = ExportMap(
    zone="Europe/Lisbon",
    columns=_columns(("Start",), ("i_n",)),
    stamp_format="%Y-%m-%d %H:%M",
    pf_convention="unsigned",
    scale={"i_a": 1000, "i_b": 1000, "i_c": 1000},
)
UTC_ISO = ExportMap(
    zone="Europe/Athens",
    columns=_columns(("utc",), ("lead_lag_a", "lead_lag_b", "lead_lag_c")),
    clock="utc",
    pf_convention="sign-is-power-flow",
)
SPLIT = ExportMap(
    zone="Europe/Berlin",
    columns=_columns(("Date", "Time")),
    stamp="end",
    stamp_format="%Y-%m-%d %H:%M",
    pf_convention="sign-is-lead-lag",
    lagging_sign="positive",
    delimiter="\t",
)


def _loads(
    zone: str, first: str, after: str, lead: Callable[[datetime], bool]
) -> dict[datetime, Planted]:
    """A plain pattern from one local midnight to another; `lead` takes the local time."""
    starts = run_of(local_start(zone, first, "00:00"), local_start(zone, after, "00:00"))
    truth = {}
    for n, start in enumerate(starts):
        wall = start.replace(tzinfo=UTC).astimezone(ZoneInfo(zone))
        base = 2500 + 900 * min(wall.hour, 24 - wall.hour)
        amps = (base + n * 61 % 1709, base + n * 43 % 1511, base + n * 29 % 1301)
        volts = (2300 + n * 3 % 47, 2295 + n * 5 % 53, 2305 + n * 7 % 41)
        factors = (8200 + n * 41 % 1771, 8300 + n * 31 % 1669, 8100 + n * 59 % 1873)
        leads = lead(wall)
        truth[start] = Planted(start, volts, amps, factors, (leads, leads, leads))
    return truth


def newest_first(folder: Path) -> Export:
    """Newest first over the autumn change, 30-minute block demand, metered neutral, in kA.

    The highest interval stands beside a lost one: its window is incomplete and no peak.
    """
    service = Service(rating_a=400.0, demand_window_min=30)
    zone = NEWEST_FIRST.zone
    truth = _loads(zone, "2025-10-24", "2025-11-03", lambda _wall: False)
    lone = local_start(zone, "2025-10-28", "12:30")
    truth[lone] = replace(truth[lone], i_ca=(39000, 39100, 39200), pf_bp=(9900, 9900, 9900))
    for clock in ("09:15", "09:30"):  # high together, yet in two block windows
        start = local_start(zone, "2025-10-29", clock)
        truth[start] = replace(truth[start], i_ca=(30000, 30100, 30200))
    lines = body_of(truth, NEWEST_FIRST)
    del lines[local_start(zone, "2025-10-28", "12:45")]
    body = list(lines.values())[::-1]
    body.insert(40, Line("2025-11-02", "rejected"))
    head = [",".join(header for _, header, _ in NEWEST_FIRST.columns)]
    export = Export(folder, folder / "exports" / "newest.csv", NEWEST_FIRST, service, truth)
    toml = site_toml(NEWEST_FIRST, service, declared=False)
    return write_site(folder, export, head, body, toml)


def utc_iso(folder: Path) -> Export:
    """UTC, ISO 8601, signed power flow with lead/lag columns, sliding 30-minute demand.

    Some hours export. The March peak begins at 23:45 on its last day and ends in April.
    """
    service = Service(rating_a=400.0, demand_window_min=30, demand_kind="sliding")
    zone = UTC_ISO.zone
    truth = _loads(zone, "2025-03-28", "2025-04-03", lambda wall: wall.hour in (1, 11, 20))
    for start in run_of(
        local_start(zone, "2025-03-30", "10:00"), local_start(zone, "2025-03-30", "13:00")
    ):
        truth[start] = replace(truth[start], exporting=True)
    for day, clock, amps in (("2025-03-31", "23:45", 35000), ("2025-04-01", "00:00", 35500)):
        start = local_start(zone, day, clock)
        truth[start] = replace(truth[start], i_ca=(amps, amps + 10, amps + 20))
    head = [",".join(header for _, header, _ in UTC_ISO.columns)]
    export = Export(folder, folder / "exports" / "iso.csv", UTC_ISO, service, truth)
    body = list(body_of(truth, UTC_ISO).values())
    return write_site(folder, export, head, body, site_toml(UTC_ISO, service))


def split_24(folder: Path) -> Export:
    """Date and time apart, midnight as 24:00, lagging PF positive, local end stamps, spring change.

    Two stamps stand in the hour that does not exist, and one value is no number.
    """
    service = Service(rating_a=400.0, demand_window_min=30)
    zone = SPLIT.zone
    truth = _loads(zone, "2025-03-28", "2025-04-03", lambda wall: wall.hour in (3, 4))
    lines = body_of(truth, SPLIT)
    odd = local_start(zone, "2025-03-31", "08:00")
    cells = lines[odd].text.split("\t")
    cells[7] = "#REF!"
    lines[odd] = Line("\t".join(cells), "stored", ("i_c",), odd)
    body = list(lines.values())
    change = list(lines).index(local_start(zone, "2025-03-30", "03:00"))
    for clock in ("02:45", "02:30"):
        body.insert(
            change,
            Line("\t".join(["2025-03-30", clock, *cells[2:7], "1.00", *cells[8:]]), "rejected"),
        )
    head = ["\t".join(header for _, header, _ in SPLIT.columns)]
    export = Export(folder, folder / "exports" / "split.txt", SPLIT, service, truth)
    return write_site(folder, export, head, body, site_toml(SPLIT, service))


def lone_repeated_stamp(folder: Path) -> Export:
    """One stamp in the repeated hour with nothing beside it: no clock can tell which."""
    service = Service(rating_a=400.0)
    zone = NEWEST_FIRST.zone
    truth = _loads(zone, "2025-10-25", "2025-10-27", lambda _wall: False)
    lost = run_of(
        local_start(zone, "2025-10-26", "00:00"), local_start(zone, "2025-10-26", "05:00")
    )
    lines = body_of(truth, NEWEST_FIRST)
    for start in lost:
        if start != local_start(zone, "2025-10-26", "01:30"):
            del lines[start]
    lines[local_start(zone, "2025-10-26", "01:30")].outcome = "rejected"
    head = [",".join(header for _, header, _ in NEWEST_FIRST.columns)]
    export = Export(folder, folder / "exports" / "lone.csv", NEWEST_FIRST, service, truth)
    toml = site_toml(NEWEST_FIRST, service)
    return write_site(folder, export, head, list(lines.values()), toml)


def assumed_sign(folder: Path) -> Export:
    """Signed power flow and nothing that tells the sign of Q: at export Q is not known."""
    service = Service(rating_a=400.0)
    export_map = replace(UTC_ISO, columns=_columns(("utc",)))
    truth = _loads(UTC_ISO.zone, "2025-03-28", "2025-03-30", lambda _wall: False)
    for start in run_of(
        local_start(UTC_ISO.zone, "2025-03-29", "10:00"),
        local_start(UTC_ISO.zone, "2025-03-29", "11:00"),
    ):
        truth[start] = replace(truth[start], exporting=True)
    head = [",".join(header for _, header, _ in export_map.columns)]
    export = Export(folder, folder / "exports" / "assumed.csv", export_map, service, truth)
    body = list(body_of(truth, export_map).values())
    return write_site(folder, export, head, body, site_toml(export_map, service))


BUILDERS: dict[str, Callable[[Path], Export]] = {
    "awkward": awkward_export.build,
    "newest-first": newest_first,
    "utc-iso": utc_iso,
    "split-24": split_24,
}
