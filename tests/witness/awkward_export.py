"""An ugly export over the autumn clock change, with every fault planted by hand.

Six lines of preamble, a header on line 7, a row of units, semicolons, decimal commas,
cp1252, PF in percent signed for lag, end stamps on the local clock. Each fault stands in
`spoil`, with the outcome that the interface gives it.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

from plain_power import Service
from plain_reader import ExportMap
from planted_load import (
    Export,
    Line,
    Planted,
    Triple,
    body_of,
    local_start,
    run_of,
    site_toml,
    write_site,
)

ZONE = "Europe/Helsinki"
COLUMNS = (
    ("timestamp", "Zeit bis (Ende)", ""),
    ("v_a", "Spannung für L1", "V"),
    ("v_b", "Spannung für L2", "V"),
    ("v_c", "Spannung für L3", "V"),
    ("i_a", "Strom für L1", "A"),
    ("i_b", "Strom für L2", "A"),
    ("i_c", "Strom für L3", "A"),
    ("", "Außentemperatur °C", "°C"),
    ("pf_a", "Wirkfaktor ± L1", "%"),
    ("pf_b", "Wirkfaktor ± L2", "%"),
    ("pf_c", "Wirkfaktor ± L3", "%"),
    ("quality", "Gültigkeit", ""),
)
MAP = ExportMap(
    zone=ZONE,
    columns=COLUMNS,
    stamp="end",
    stamp_format="%d.%m.%Y %H:%M",
    pf_convention="sign-is-lead-lag",
    pf_percent=True,
    lagging_sign="negative",
    delimiter=";",
    decimal=",",
    thousands=".",
    encoding="cp1252",
    header_row=7,
    units_row=True,
)
SERVICE = Service(rating_a=1600.0)
PREAMBLE = [
    "Prüfbericht;Zähler 0815",
    "Anlage;Hauptverteilung",
    "",
    "Wandler;1600/5;A",
    "Zeitraum;20.10.2025;03.11.2025",
    "Bemerkung;Uhr läuft mit Sommerzeit;;;;",
]
SHAPE_A = (60, 52, 48, 46, 50, 70, 120, 260, 410, 520, 560, 540,
           480, 530, 550, 510, 430, 320, 240, 190, 150, 120, 90, 70)  # fmt: skip


def at(day: str, clock: str) -> datetime:
    """UTC start of the interval that begins at a local time of the site."""
    return local_start(ZONE, day, clock)


def load_at(n: int, start: datetime) -> Planted:
    """The regular pattern: a working day's shape, light nights on Sundays, some leading."""
    wall = start.replace(tzinfo=UTC).astimezone(ZoneInfo(ZONE))
    base = SHAPE_A[wall.hour] * 100
    if wall.weekday() >= 5:
        base //= 4
    if wall.weekday() == 6 and wall.hour < 4:
        base //= 2  # 6 to 7.5 A and what is added below: some phases under the floor of 32 A
    amps = [
        base * share // 100 + (n * 37 + k * 1171) % 2903 for k, share in enumerate((100, 94, 107))
    ]
    volts = [2309 + (n * 7 + k * 23) % 61 - 30 - base // 2500 for k in range(3)]
    factors = [7800 + (n * 53 + k * 617) % 2150 for k in range(3)]
    lead = wall.hour < 6 and wall.weekday() < 6 and (n // 8) % 3 == 0
    return Planted(start, _triple(volts), _triple(amps), _triple(factors), (lead, lead, lead))


def _triple(values: list[int]) -> Triple:
    return (values[0], values[1], values[2])


def plant_loads(truth: dict[datetime, Planted]) -> set[datetime]:
    """Change true loads: tied peaks, low voltage, no load, floor, imbalance; what is loose.

    Returns the starts whose current angles the documents leave open.
    """

    def put(day: str, clock: str, **changes: Any) -> datetime:
        start = at(day, clock)
        truth[start] = replace(truth[start], **changes)
        return start

    volts, amps = (2305, 2298, 2311), (109050, 108725, 112375)
    put("2025-10-23", "14:30", v_dv=volts, i_ca=amps, pf_bp=(8925, 9010, 8875))
    # the same power twice: the earlier one is the peak
    put("2025-10-21", "10:15", v_dv=volts, i_ca=amps, pf_bp=(8925, 9010, 8875))
    # the kVA peak is another interval than the kW peak
    poor = put("2025-10-22", "10:15", i_ca=(112000, 113000, 115000), pf_bp=(5500, 5600, 5700))
    truth[poor] = replace(truth[poor], v_dv=(2330, 2330, 2330))
    put("2025-11-01", "00:00", i_ca=(60000, 61000, 62000))  # the first of November, end stamp
    for clock in ("05:00", "05:15", "05:30"):
        put("2025-10-22", clock, v_dv=(2312, 2050, 2308))
    put("2025-10-30", "05:00", v_dv=(2312, 2308, 2561))
    for start in run_of(at("2025-10-24", "08:00"), at("2025-10-24", "12:00")):
        x = truth[start]
        amps = (x.i_ca[0], x.i_ca[1] * 3 // 2, x.i_ca[2] // 3)
        truth[start] = replace(x, i_ca=amps, v_dv=(x.v_dv[0], x.v_dv[1], x.v_dv[2] - 180))
    blank = (True, True, True)
    for clock in ("22:00", "22:15", "22:30"):
        put("2025-10-26", clock, i_ca=(0, 0, 0), pf_blank=blank)
    put("2025-10-22", "13:00", i_ca=(51000, 52000, 0), pf_blank=(False, False, True))
    put("2025-10-22", "13:15", i_ca=(3200, 3300, 3400))  # on the floor of 32 A: not below it
    put("2025-10-22", "13:30", i_ca=(3199, 3300, 3400))
    put("2025-10-22", "13:45", i_ca=(3199, 3198, 3197))
    put("2025-10-21", "08:00", pf_bp=(10030, 9500, 10000))  # 100,3 %: clamped
    return {put("2025-10-22", "14:00", i_ca=(50000, 49000, 2000), pf_blank=(False, False, True))}


def spoil_cells(start: datetime, cells: list[str]) -> None:
    """Spoil single cells of rows that stay rows (columns by their place in COLUMNS)."""
    keys = [key for key, _, _ in COLUMNS]
    found = CELL_FAULTS.get(start)
    if found is not None:
        cells[keys.index(found[0])] = found[1]


CELL_FAULTS = {
    at("2025-10-23", "09:00"): ("pf_b", "-130,00"),
    at("2025-10-23", "09:15"): ("v_a", "-231,2"),
    at("2025-10-23", "09:30"): ("i_c", "inf"),
    at("2025-10-23", "10:30"): ("i_a", "-5,00"),
    at("2025-10-23", "10:45"): ("pf_a", "nan"),
    at("2025-10-23", "09:45"): ("i_b", "---"),
    at("2025-10-23", "10:00"): ("v_c", "n/a"),
    at("2025-10-23", "10:15"): ("pf_b", ""),
    at("2025-10-25", "03:30"): ("i_b", "---"),
    at("2025-10-25", "04:30"): ("pf_c", "n/a"),
    at("2025-10-25", "12:00"): ("quality", "E"),
}
IMPOSSIBLE = ("-130,00", "-231,2", "inf", "-5,00", "nan")


def spoil(lines: dict[datetime, Line]) -> list[Line]:
    """Break rows, repeat rows, move and drop blocks; the body in its final order."""
    for start, (key, text) in CELL_FAULTS.items():
        if text in IMPOSSIBLE:
            lines[start].impossible = (key,)
    _break_rows(lines)
    for start in run_of(at("2025-10-29", "01:00"), at("2025-10-29", "03:45")):
        del lines[start]
    late = [lines.pop(x) for x in run_of(at("2025-10-27", "06:00"), at("2025-10-27", "09:00"))]
    after = _repeats(lines)
    after.setdefault(at("2025-10-28", "07:45"), []).extend(late)
    body: list[Line] = []
    for start, line in lines.items():
        body.append(line)
        body += after.get(start, [])
    return [*body, Line("", None), Line("Ende des Berichts;1444 Werte", "rejected")]


def _break_rows(lines: dict[datetime, Line]) -> None:
    """Rows that cannot be used; their intervals become a gap."""

    def rewrite(clock: str, text: str) -> None:
        start = at("2025-10-24", clock)
        lines[start] = Line(text, "rejected")

    cells = lines[at("2025-10-24", "06:00")].text.split(";")
    rewrite("06:00", ";".join(cells[:6]))
    rewrite("06:15", lines[at("2025-10-24", "06:15")].text + ";9")
    rewrite("06:30", ";".join(["32.10.2025 99:99", *cells[1:]]))
    rewrite("06:45", "24.10.2025 07:00;---;n/a;;---;n/a;;18;---;n/a;;OK")
    rewrite("07:00", ";" * 11)


def _repeats(lines: dict[datetime, Line]) -> dict[datetime, list[Line]]:
    """Lines that come again, keyed by the interval after which they stand."""
    after: dict[datetime, list[Line]] = {}

    def again(
        clock: str, outcome: str, later: str | None = None, bad: str = "", **changes: str
    ) -> None:
        start = at("2025-10-25", clock)
        cells = lines[start].text.split(";")
        for key, text in changes.items():
            cells[[name for name, _, _ in COLUMNS].index(key)] = text
        place = at("2025-10-25", later) if later else start
        impossible = (bad,) if bad else ()
        after.setdefault(place, []).append(Line(";".join(cells), outcome, impossible, start))

    again("03:00", "duplicate")
    again("03:00", "duplicate", "18:00")
    again("03:15", "replaced", "06:00", i_a="40,25")
    again("03:30", "stored", "06:00", i_b="41,50", v_a="---", i_a="n/a", pf_c="")
    again("03:45", "duplicate", "06:00", v_a="---", pf_b="")
    again("04:00", "replaced", "06:00", i_c="39,75")
    again("04:00", "replaced", "06:30")  # back to the first value: a change again
    again("04:15", "replaced", "06:00", i_a="44,00", v_b="n/a")
    again("04:30", "replaced", "06:00", i_a="45,00", pf_c="-91,25")
    again("04:45", "duplicate", "06:00", v_b="-229,9", bad="v_b")
    again("05:00", "rejected", "06:00", v_a="", v_b="", v_c="", i_a="---", i_b="---", i_c="---",
          pf_a="n/a", pf_b="n/a", pf_c="n/a")  # fmt: skip
    after[at("2025-10-25", "20:00")] = [Line("", None), Line("   ", None), Line("", None)]
    return after


def build(folder: Path, export_map: ExportMap = MAP) -> Export:
    """Write the awkward site into an empty folder.

    Parameters
    ----------
    folder : Path
        Where the site goes.
    export_map : ExportMap
        What ``site.toml`` says of the file (a wrong map for the correction test); the file
        itself is always the same.
    """
    starts = run_of(at("2025-10-20", "00:00"), at("2025-11-04", "00:00"))
    truth = {start: load_at(n, start) for n, start in enumerate(starts)}
    loose = plant_loads(truth)
    lines = body_of(truth, MAP, spoil_cells)
    units = [unit for _, _, unit in COLUMNS]
    head = [*PREAMBLE, ";".join(header for _, header, _ in COLUMNS), ";".join(units)]
    export = Export(folder, folder / "exports" / "schlimm.csv", export_map, SERVICE, truth)
    export.loose = loose
    toml = site_toml(export_map, SERVICE, extra='estimated = ["E"]\n')
    return write_site(folder, export, head, spoil(lines), toml, "\r\n")
