"""The four meters: what each prints, and what goes wrong in its exports."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime, timedelta

import numpy as np

from generator.circuit import Record
from generator.clock import STANDARD, epoch
from generator.exports import (
    BadValue,
    Export,
    Line,
    again,
    change_field,
    position,
    spoil,
    starts_of,
    without,
)
from generator.planted import BY_KEY

NOVEMBER = "2026-11-01 00:00"


def _span(key: str, interval_min: int = 15) -> list[int]:
    planted = BY_KEY[key]
    return starts_of(key, epoch(planted.start), epoch(planted.end), interval_min)


def _printed(values: object, decimals: int) -> list[list[str]]:
    """Print an array (3, n) as three columns."""
    return [[f"{value:.{decimals}f}" for value in row] for row in np.asarray(values).tolist()]


def _power_factors(record: Record) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Return |P|/S per phase, negative where leading."""
    s = record.v * np.conj(record.i)
    return np.asarray(np.abs(s.real) / np.abs(s) * np.where(s.imag < 0.0, -1.0, 1.0))


def _lines(record: Record, stamps: Sequence[Sequence[str]], columns: list[list[str]]) -> list[Line]:
    """Return one line an interval: its stamp or stamps, then the columns."""
    rows = zip(*columns, strict=True)
    return [
        Line((*stamp, *row), start)
        for stamp, row, start in zip(stamps, rows, record.grid.start.tolist(), strict=True)
    ]


def _ends(record: Record) -> list[datetime]:
    """Return interval ends on the site's wall clock."""
    length = timedelta(minutes=record.grid.interval_min)
    return [
        (start.astimezone(UTC) + length).astimezone(start.tzinfo) for start in record.grid.local
    ]


def plant(record: Record) -> list[Export]:
    """Semicolons, decimal commas, end stamps on the wall clock, lagging printed negative."""
    stamps = [[f"{end:%d.%m.%Y %H:%M}"] for end in _ends(record)]
    columns = [
        *_printed(np.abs(record.v), 2),
        *_printed(np.abs(record.i), 2),
        *_printed(-_power_factors(record), 4),
    ]
    commas = [[text.replace(".", ",") for text in column] for column in columns]
    lines = _lines(record, stamps, commas)
    _, good, *_ = span = _span("plant-broken")
    spoil(lines, span[0], ("37.10.2026 10:15", *lines[position(lines, span[0])].fields[1:]), "time")
    spoil(lines, good, lines[position(lines, good)].fields[:5], "fields")
    stamp = lines[position(lines, span[3])].fields[0]
    spoil(lines, span[3], (stamp, *["---"] * 9), "no measurement")
    for start in _span("plant-missing"):
        change_field(lines, start, 6, "---")
    lines = without(lines, set(_span("plant-gap")))
    border = position(lines, epoch(NOVEMBER))
    overlap = again(lines[border - len(_span("plant-overlap")) : border])
    head = (
        "Rapport de mesure;;;;;;;;;",
        "Appareil;Analyseur de réseau, départ général;;;;;;;;",
        "Rapport TC;1000/5;;;;;;;;",
        "Période;15 min;;;;;;;;",
        ";;;;;;;;;",
        "Relevé;Ø U L1-N;Ø U L2-N;Ø U L3-N;Ø I L1;Ø I L2;Ø I L3;cos L1;cos L2;cos L3",
        ";V;V;V;A;A;A;;;",
    )
    october, november = lines[:border], overlap + lines[border:]
    return [
        Export(name, "plant", head, tuple(part), ";", "\r\n", "cp1252")
        for name, part in (("plant-2026-10.csv", october), ("plant-2026-11.csv", november))
    ]


def office(record: Record) -> list[Export]:
    """ISO stamps of the interval's start in standard time all year, leading printed negative."""
    stamps = [
        [start.astimezone(STANDARD).strftime("%Y-%m-%dT%H:%M:%S")] for start in record.grid.local
    ]
    columns = [
        *_printed(np.abs(record.v), 2),
        *_printed(np.abs(record.i), 3),
        *_printed(record.i_neutral_a[None, :], 3),
        *_printed(_power_factors(record), 4),
    ]
    lines = _lines(record, stamps, columns)
    first, _, third, *_ = _span("office-impossible")
    change_field(lines, first, 9, "1.2140", BadValue("pf_b", "1.2140", "impossible value"))
    change_field(lines, third, 6, "-5.204", BadValue("i_c", "-5.204", "impossible value"))
    day = _span("office-repeat")
    begin = position(lines, day[0])
    lines += again(lines[begin : begin + len(day)])
    head = ("timestamp,v_l1,v_l2,v_l3,i_l1,i_l2,i_l3,i_n,pf_l1,pf_l2,pf_l3",)
    return [Export("office.csv", "office", head, tuple(lines))]


def workshop(record: Record) -> list[Export]:
    """Date and time apart, midnight as 24:00, tabs; kW and kvar of each phase, no PF."""
    stamps = []
    for start, end in zip(record.grid.local, _ends(record), strict=True):
        midnight = end.hour == 0 and end.minute == 0
        day = start if midnight else end
        stamps.append([f"{day:%d/%m/%Y}", "24:00" if midnight else f"{end:%H:%M}"])
    between = np.roll(record.v, -1, axis=0)
    s = record.v * np.conj(record.i) / 1000.0
    columns = [
        *_printed(np.abs(record.v), 2),
        *_printed(np.abs(record.v - between), 2),
        *_printed(np.abs(record.i), 3),
        *_printed(s.real, 3),
        *_printed(s.imag, 3),
    ]
    lines = _lines(record, stamps, columns)
    good = _span("workshop-broken")
    spoil(lines, good[0], ("21/10/2026", "*** restart, memory card full ***"), "fields")
    spoil(lines, good[1], lines[position(lines, good[1])].fields[:11], "fields")
    row = lines[position(lines, good[2])].fields
    spoil(lines, good[2], ("00/00/0000", *row[1:]), "time")
    corrected = [_corrected(lines, start) for start in _span("workshop-corrected")]
    border = position(lines, epoch(NOVEMBER))
    footer = Line(("*** end of file ***",), 0, "rejected", "fields")
    head = (
        "Date\tTime\tU1N [V]\tU2N [V]\tU3N [V]\tU12 [V]\tU23 [V]\tU31 [V]\tI1 [A]\tI2 [A]\tI3 [A]"
        "\tP1 [kW]\tP2 [kW]\tP3 [kW]\tQ1 [kvar]\tQ2 [kvar]\tQ3 [kvar]",
    )
    october, november = [*lines[:border], *corrected, footer], lines[border:]
    return [
        Export(name, "workshop", head, tuple(part), "\t")
        for name, part in (("workshop-2026-10.txt", october), ("workshop-2026-11.txt", november))
    ]


def _corrected(lines: list[Line], start: int) -> Line:
    """Spoil the currents and powers of a row in place; return its correction."""
    index = position(lines, start)
    right = lines[index]
    wrong = [f"{float(text) * 0.9:.3f}" for text in right.fields[8:]]
    lines[index] = Line((*right.fields[:8], *wrong), start)
    return Line(right.fields, start, "replaced")


def compressors(record: Record) -> list[Export]:
    """Seconds since 1970, the newest minute first, unsigned power factor in percent."""
    stamps = [[str(start)] for start in record.grid.start.tolist()]
    columns = [
        *_printed(np.abs(record.v), 2),
        *_printed(np.abs(record.i), 2),
        *_printed(100.0 * np.abs(_power_factors(record)), 2),
    ]
    lines = _lines(record, stamps, columns)
    cut = _span("compressors-broken", 1)[0]
    spoil(lines, cut, lines[position(lines, cut)].fields[:4], "fields")
    lines = without(lines, set(_span("compressors-gap", 1)))
    head = ("Epoch,V1,V2,V3,A1,A2,A3,PF1 %,PF2 %,PF3 %",)
    return [Export("compressors-2026-11.csv", "compressors", head, tuple(reversed(lines)))]


def exports(records: dict[str, Record]) -> list[Export]:
    """Return every export of the site, in the order in which the files are read."""
    made = [
        *compressors(records["compressors"]),
        *office(records["office"]),
        *plant(records["plant"]),
        *workshop(records["workshop"]),
    ]
    return sorted(made, key=lambda export: export.name)
