"""What is written beside the exports: `planted.json` and the README."""

from __future__ import annotations

import json
from datetime import UTC, datetime, timedelta

from generator.circuit import Record
from generator.clock import TIMEZONE, ZONE, instant
from generator.exports import Export
from generator.planted import PLANTED, Planted
from generator.witness import RULES, mean, runs, worst

SITE = "Tarvelle Works"


def _span(planted: Planted) -> tuple[datetime, datetime]:
    """Return a planted thing's first and last instant."""
    return instant(planted.start), instant(planted.end)


def _periods(record: Record, planted: Planted) -> list[dict[str, object]]:
    """Return the runs of the rule of the same name that lie within a planted thing."""
    first, last = _span(planted)
    length = timedelta(minutes=record.grid.interval_min)
    found: list[dict[str, object]] = []
    for begin, end in runs(record, planted.kind):
        start = record.grid.local[begin]
        # By way of UTC: arithmetic on local times would miss the repeated hour.
        stop = (record.grid.local[end - 1].astimezone(UTC) + length).astimezone(ZONE)
        if first.astimezone(UTC) <= start.astimezone(UTC) and (
            stop.astimezone(UTC) <= last.astimezone(UTC)
        ):
            entry = {"start": start.isoformat(), "end": stop.isoformat(), "intervals": end - begin}
            found.append(entry)
    return found


def planted_entry(record: Record, planted: Planted) -> dict[str, object]:
    """Return one planted thing as `planted.json` lists it."""
    first, last = _span(planted)
    entry: dict[str, object] = {
        "key": planted.key,
        "service": planted.service,
        "kind": planted.kind,
        "start": first.isoformat(),
        "end": last.isoformat(),
        "phase": planted.phase,
        "rows": planted.rows,
        "cause": planted.cause,
        "shows": planted.shows,
        "magnitude": None,
        "mean": None,
        "unit": None,
        "periods": [],
    }
    if planted.kind in RULES:
        inside = record.grid.within(planted.start, planted.end)
        entry["magnitude"] = round(worst(record, planted.kind, inside), 4)
        entry["mean"] = round(mean(record, planted.kind, inside), 4)
        entry["unit"] = RULES[planted.kind].unit
        entry["periods"] = _periods(record, planted)
    return entry


def planted_json(records: dict[str, Record], made: list[Export]) -> str:
    """Return `planted.json`: what was planted, what must be found, how the files must read."""
    found = {
        f"{service}/{kind}": len(runs(record, kind))
        for service, record in records.items()
        for kind in RULES
    }
    document = {
        "site": SITE,
        "timezone": TIMEZONE,
        "planted": [planted_entry(records[planted.service], planted) for planted in PLANTED],
        "period_counts": found,
        "files": [export.expected() for export in made],
    }
    return json.dumps(document, indent=1, ensure_ascii=False) + "\n"


def _figure(entry: dict[str, object]) -> str:
    if entry["magnitude"] is None:
        if entry["rows"] is None:
            return ""
        return "1 row" if entry["rows"] == 1 else f"{entry['rows']} rows"
    unit = "" if entry["unit"] == "1" else f" {entry['unit']}"
    return f"worst {entry['magnitude']}{unit}, mean {entry['mean']}{unit}"


def _planted_table(records: dict[str, Record]) -> list[str]:
    table = [
        "| service | what | from | to | phase | cause | how it shows | figures |",
        "| --- | --- | --- | --- | --- | --- | --- | --- |",
    ]
    for planted in PLANTED:
        entry = planted_entry(records[planted.service], planted)
        first, last = (str(entry[key])[:16].replace("T", " ") for key in ("start", "end"))
        cells = (
            planted.service, planted.kind, first, last, planted.phase or "",
            planted.cause, planted.shows, _figure(entry),
        )  # fmt: skip
        table.append("| " + " | ".join(cells) + " |")
    return table


def _file_table(made: list[Export]) -> list[str]:
    keys = ("read", "stored", "replaced", "duplicate", "rejected")
    table = [
        "| file | " + " | ".join(keys) + " | values rejected |",
        "| --- |" + " --- |" * 6,
    ]
    for export in made:
        expected = export.expected()
        counts = " | ".join(str(expected[f"rows_{key}"]) for key in keys)
        table.append(f"| `{export.name}` | {counts} | {expected['values_rejected']} |")
    return table


INTRODUCTION = f"""# The demo site: {SITE}

An invented site. {SITE} does not exist; no reading in this folder comes from a real place,
business or meter. The zone is {TIMEZONE}, because its clocks change within the two months.

Everything under `exports/`, `planted.json` and this README is written by a seeded script that
computes loads and phasors on a supply behind impedances. It shares no code with the program:

    python demo_data/generate.py              # writes the same bytes every time
    python demo_data/generate.py --out DIR    # elsewhere

`site.toml` is written by hand.

| service | what it is | record | its meter |
| --- | --- | --- | --- |
| `plant` | motors in two and a half shifts behind an automatic bank, 800 A | Oct and Nov 2026, \
15 min | two files, semicolons, decimal commas, preamble and units, Windows encoding; end stamps \
on the wall clock; lagging PF printed negative |
| `office` | lighting, electronics, air handling, a timed 20 kvar bank, 315 A | Oct and Nov 2026, \
15 min | ISO start stamps in standard time all year; leading PF printed negative; metered neutral |
| `workshop` | furnaces and drives on a night shift, 250 A | Oct and Nov 2026, 15 min | tabs, date \
and time apart, end stamps with 24:00; L-N and L-L voltages, kW and kvar of each phase |
| `compressors` | one drive, one fixed-speed machine, 200 A | Nov 2026, 1 min | seconds since \
1970, newest first, unsigned PF in percent |

Wednesday 28 October 2026 is a holiday. Phase quantities are those of the fundamental; only the
neutral meter of the office also reads the third harmonics that add up there. Source voltages stand
exactly 120° apart, so the terminal angles stray from it by less than one degree.
"""

RULES_TEXT = """
A span in the table is the cause's. The runs that the program's rules make of it are listed in
`planted.json` as `periods`, judged from the true phasors (the default rules: enter and leave
thresholds, current floors, least durations), with gaps in the exports left out of account: a run
that meets a gap may be cut in two by a reader. `period_counts` holds the number of runs of every
rule in every record: none lies outside a planted span.
"""


def readme(records: dict[str, Record], made: list[Export]) -> str:
    """Return the README of the demo folder."""
    return "\n".join(
        [
            INTRODUCTION,
            "## What was planted, where\n",
            "Times are site-local; the start belongs to the span, the end does not.\n",
            *_planted_table(records),
            RULES_TEXT,
            "## What reading the files must give\n",
            "Read once, in this order. A broken row leaves its interval missing.\n",
            *_file_table(made),
            "",
        ]
    )
