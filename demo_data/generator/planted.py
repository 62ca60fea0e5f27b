"""The table of what is planted: the one home of every instant.

The services' circuits, the exports, `planted.json` and the README are all made from it.
Times are site-local, start included, end excluded.
"""

from __future__ import annotations

from dataclasses import dataclass

from generator.clock import Grid, Mask


@dataclass(frozen=True)
class Planted:
    """One planted thing.

    Attributes
    ----------
    key : str
        Its name in this table.
    service : str
        Service id.
    kind : str
        What a reader of the record should call it.
    start, end : str
        Site-local, `YYYY-MM-DD HH:MM`.
    phase : str or None
        `a`, `b`, `c`, or None where no single phase is meant.
    cause : str
        What happened on the site.
    shows : str
        How it shows in the record.
    rows : int or None
        Lines of the export that are missing, repeated, replaced or broken.
    """

    key: str
    service: str
    kind: str
    start: str
    end: str
    phase: str | None
    cause: str
    shows: str
    rows: int | None = None


def _leading_nights() -> tuple[Planted, ...]:
    nights = (
        ("2026-11-02", "2026-11-03"),
        ("2026-11-03", "2026-11-04"),
        ("2026-11-04", "2026-11-05"),
        ("2026-11-05", "2026-11-06"),
        ("2026-11-06", "2026-11-09"),
        ("2026-11-09", "2026-11-10"),
        ("2026-11-10", "2026-11-11"),
    )
    return tuple(
        Planted(
            key=f"office-leading-{number}",
            service="office",
            kind="leading",
            start=f"{evening} 20:00",
            end=f"{morning} 06:00",
            phase=None,
            cause="the timer of the fixed 20 kvar bank has failed: the bank stays on",
            shows="leading power factor all night"
            + (" and over the weekend" if evening == "2026-11-06" else ""),
        )
        for number, (evening, morning) in enumerate(nights, start=1)
    )


PLANTED: tuple[Planted, ...] = (
    Planted(
        "plant-bank-out", "plant", "low-pf", "2026-10-12 07:15", "2026-10-26 10:30", None,
        "the automatic 8 × 25 kvar bank is out of service",
        "lagging power factor 0.7 to 0.85 day and night, for two weeks and across the clock change",
    ),
    Planted(
        "plant-dst", "plant", "dst", "2026-10-25 03:00", "2026-10-25 04:00", None,
        "the clocks go back at 04:00 to 03:00",
        "the stamps of one hour are printed twice; the day has 100 intervals",
    ),
    Planted(
        "plant-overlap", "plant", "duplicate-rows", "2026-10-31 22:00", "2026-11-01 00:00", None,
        "the November export begins with the last two hours of October",
        "eight equal rows in both files", 8,
    ),
    Planted(
        "plant-gap", "plant", "gap", "2026-11-03 09:15", "2026-11-03 13:30", None,
        "the logger had no auxiliary supply", "no rows at all", 17,
    ),
    Planted(
        "plant-missing", "plant", "missing-values", "2026-11-05 18:00", "2026-11-05 22:15", "c",
        "the current input of L3 is disconnected for a test",
        "the current of L3 reads ---: no total power", 17,
    ),
    Planted(
        "plant-broken", "plant", "broken-rows", "2026-10-07 10:00", "2026-10-07 11:00", None,
        "a transmission fault", "a day 37, a cut-off row, a row without any measurement", 3,
    ),
    Planted(
        "plant-imbalance", "plant", "voltage-imbalance", "2026-11-19 08:00", "2026-11-19 14:00",
        None, "a fault on the medium-voltage side: L1 low, L3 high",
        "V2/V1 about 2.5 %, every voltage still in its band",
    ),
    Planted(
        "plant-motor-currents", "plant", "current-imbalance", "2026-11-19 08:00",
        "2026-11-19 14:00", None,
        "the motors answer the voltage imbalance",
        "currents well over 10 % apart: several times the voltage imbalance",
    ),
    *_leading_nights(),
    Planted(
        "office-heater", "office", "current-imbalance", "2026-11-16 07:30", "2026-11-20 17:45",
        "b", "an 18 kW heater on L2 sticks",
        "L2 runs some 80 A above its neighbours, neutral loaded",
    ),
    Planted(
        "office-repeat", "office", "duplicate-rows", "2026-10-20 00:00", "2026-10-21 00:00", None,
        "one day was read out twice", "96 equal rows once more at the end of the file", 96,
    ),
    Planted(
        "office-impossible", "office", "impossible-values", "2026-10-08 09:00",
        "2026-10-08 10:00", None, "a firmware fault",
        "one power factor of 1.2140, one current below zero; the rest of each row is good", 2,
    ),
    Planted(
        "workshop-corrected", "workshop", "replaced-rows", "2026-10-06 14:00", "2026-10-06 15:00",
        None, "corrected readings follow at the end of the October file",
        "four rows with other values for intervals already read", 4,
    ),
    Planted(
        "workshop-low-voltage", "workshop", "voltage", "2026-10-14 21:30", "2026-10-14 22:45",
        None, "the network's tap changer sticks", "all voltages at about 0.87 of nominal",
    ),
    Planted(
        "workshop-broken", "workshop", "broken-rows", "2026-10-21 12:00", "2026-10-21 13:00", None,
        "a full memory card", "a restart message, a cut-off row, an unreadable date", 3,
    ),
    Planted(
        "workshop-dst", "workshop", "dst", "2026-10-25 03:00", "2026-10-25 04:00", None,
        "the clocks go back at 04:00 to 03:00",
        "the stamps of one hour are printed twice; the day has 100 intervals",
    ),
    Planted(
        "workshop-overload", "workshop", "overload", "2026-11-10 01:15", "2026-11-10 02:00", None,
        "a second furnace is heated up in the shift's busiest hour",
        "all three currents above the 250 A rating",
    ),
    Planted(
        "compressors-unloaded", "compressors", "low-pf", "2026-11-14 22:10", "2026-11-15 03:25",
        None, "the fixed-speed compressor idles against a stuck valve, its capacitor fuse blown",
        "power factor about 0.5 through a weekend night",
    ),
    Planted(
        "compressors-gap", "compressors", "gap", "2026-11-24 10:00", "2026-11-24 11:35", None,
        "the logger restarted", "no rows at all", 95,
    ),
    Planted(
        "compressors-broken", "compressors", "broken-rows", "2026-11-18 15:20",
        "2026-11-18 15:21", None, "a cut-off line", "a row with too few fields", 1,
    ),
)  # fmt: skip

BY_KEY = {planted.key: planted for planted in PLANTED}


def window(times: Grid, key: str) -> Mask:
    """Return which intervals of a record belong to a planted thing."""
    planted = BY_KEY[key]
    return times.within(planted.start, planted.end)
