"""Small sites for the tests of queries: a few readings, through the real ingest."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

from meterlens.settings import load_site
from meterlens.store.database import Store, open_store
from meterlens.store.ingest import ingest_file

SITE = """\
[site]
name = "Small"
timezone = "{zone}"

[[service]]
id = "main"
name = "Main"
connection = "wye-4w"
nominal_voltage_v = 400
rating_a = 200
{service}
[service.columns]
timestamp = "utc"
clock = "utc"
stamp = "start"
interval_min = {interval_min}
pf_convention = "from-power"
{columns}
"""

#: UTC start → readings by key of the column map; None is an empty cell.
Reading = tuple[datetime, dict[str, float | None]]


@contextmanager
def small_site(
    folder: Path,
    readings: Iterable[Reading],
    *,
    interval_min: int,
    zone: str = "Etc/UTC",
    service: str = "",
) -> Iterator[Store]:
    """A store that holds the readings of one service, ``main``, rated 200 A at 400 V."""
    rows = list(readings)
    keys = list(dict.fromkeys(key for _, values in rows for key in values))
    folder.mkdir(parents=True, exist_ok=True)
    columns = "\n".join(f'{key} = "{key}"' for key in keys)
    (folder / "site.toml").write_text(
        SITE.format(zone=zone, service=service, interval_min=interval_min, columns=columns),
        encoding="utf-8",
    )
    lines = [",".join(["utc", *keys])]
    for start, values in rows:
        cells = ("" if values.get(key) is None else repr(values[key]) for key in keys)
        lines.append(",".join([start.strftime("%Y-%m-%d %H:%M"), *cells]))
    export = folder / "export.csv"
    export.write_text("\n".join(lines) + "\n", encoding="utf-8")
    site = load_site(folder)
    with open_store(site, write=True) as store:
        outcome = ingest_file(store, export, site.service("main"))
        assert outcome.rows_stored == len(rows), outcome
        yield store


def powers(
    start: datetime, interval_min: int, *pairs: tuple[float | None, float | None] | None
) -> list[Reading]:
    """Intervals one after another with P in kW and Q in kvar; None leaves one out."""
    step = timedelta(minutes=interval_min)
    return [
        (start + place * step, {"p_kw": pair[0], "q_kvar": pair[1]})
        for place, pair in enumerate(pairs)
        if pair is not None
    ]


def view(store: Store, name: str) -> list[dict[str, Any]]:
    """All rows of a view, in order of start."""
    relation = store.con.view(name)
    rows = [dict(zip(relation.columns, row, strict=True)) for row in relation.fetchall()]
    return sorted(rows, key=lambda row: str(row.get("start_utc", row.get("month"))))
