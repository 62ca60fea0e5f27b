"""Small exports written by hand: the four clocks, both stamps, and both clock changes.

Every expected instant was worked out on paper from the zone's rule. Lisbon: on 29 March 2026
at 01:00 UTC the clock goes from 01:00 to 02:00, on 25 October at 01:00 UTC from 02:00 to
01:00. New York: 8 March at 07:00 UTC (02:00 to 03:00), 1 November at 06:00 UTC (02:00 to
01:00). Lord Howe: 4 April 2026 at 15:00 UTC from 02:00 to 01:30 of the 5th, 3 October at
15:30 UTC from 02:00 to 02:30 of the 4th.
"""

from __future__ import annotations

from collections.abc import Iterable
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from small_site import SmallSite, counts

HEADER = "Time,Va,Vb,Vc,Ia,Ib,Ic\n"


def export(stamps: Iterable[str]) -> str:
    """A row a stamp; the current of phase a counts the rows."""
    return HEADER + "".join(f"{s},230,231,232,{n},11,12\n" for n, s in enumerate(stamps, 1))


def day(date: str, clocks: str) -> list[str]:
    """Stamps of one day from its clock readings."""
    return [f"{date}T{clock}" for clock in clocks.split()]


def run_of(first: str, count: int, minutes: int) -> list[str]:
    """So many instants, evenly apart."""
    start = datetime.fromisoformat(first)
    step = timedelta(minutes=minutes)
    return [(start + n * step).isoformat(timespec="minutes") for n in range(count)]


def take(site: SmallSite, stamps: Iterable[str]) -> dict[str, Any]:
    """Ingest an export of these stamps."""
    outcome: dict[str, Any] = site.take(export(stamps))
    return outcome


FOUR_CLOCKS = (
    ("utc", "start", "2026-07-01T12:{:02d}", "2026-07-01T12:00"),
    ("utc", "end", "2026-07-01T12:{:02d}", "2026-07-01T12:00"),
    ("local", "end", "2026-07-01T13:{:02d}", "2026-07-01T12:00"),
    ("local", "start", "2026-07-01T13:{:02d}", "2026-07-01T12:00"),
    ("local-standard", "start", "2026-07-01T12:{:02d}", "2026-07-01T12:00"),
    ("local-standard", "end", "2026-01-01T12:{:02d}", "2026-01-01T12:00"),
    ("offset", "start", "2026-07-01T14:{:02d}+02:00", "2026-07-01T12:00"),
    ("offset", "end", "2026-07-01T14:{:02d}:00+0200", "2026-07-01T12:00"),
    ("offset", "start", "2026-07-01T06:{:02d}-06:00", "2026-07-01T12:00"),
    ("offset", "start", "2026-07-01T12:{:02d}Z", "2026-07-01T12:00"),
    ("offset", "end", "2026-07-01 12:{:02d}:00Z", "2026-07-01T12:00"),
    ("utc", "start", "2026-07-01T12:{:02d}Z", "2026-07-01T12:00"),
    ("utc", "start", "2026-07-01 12:{:02d}:00+00:00", "2026-07-01T12:00"),
    ("utc", "end", "2026-07-01T12:{:02d}:00.000+0000", "2026-07-01T12:00"),
)


@pytest.mark.parametrize(("clock", "marks", "stamp", "first"), FOUR_CLOCKS)
def test_four_clocks(tmp_path: Path, clock: str, marks: str, stamp: str, first: str) -> None:
    """Summer in Lisbon is one hour ahead of UTC; an end stamp stands one interval later."""
    site = SmallSite(tmp_path).write(clock=clock, stamp=marks)
    outcome = take(site, [stamp.format(minute) for minute in (0, 15, 30, 45)])
    assert counts(outcome) == (4, 4, 0, 0, 0)
    start = datetime.fromisoformat(first) - timedelta(minutes=15 * (marks == "end"))
    assert site.starts() == run_of(start.isoformat(), 4, 15)


@pytest.mark.parametrize("mark", ["Z", "+0000", "+00:00"])
def test_offset_in_a_format_of_the_map(tmp_path: Path, mark: str) -> None:
    """`%z` takes Z as well."""
    site = SmallSite(tmp_path).write(clock="offset", timestamp_format="%d.%m.%Y %H:%M %z")
    assert counts(take(site, [f"01.07.2026 12:{m} {mark}" for m in ("00", "15")]))[1] == 2
    assert site.starts() == run_of("2026-07-01T12:00", 2, 15)


def test_other_offset_under_utc(tmp_path: Path) -> None:
    """A stamp that contradicts the map's clock is no time."""
    site = SmallSite(tmp_path).write()
    outcome = take(site, [*day("2026-07-01", "12:00Z 12:15Z"), "2026-07-01T14:30+02:00"])
    assert counts(outcome) == (3, 2, 0, 0, 1)
    assert outcome["rejects"][0]["reason"] == "no usable time"


def test_local_standard_in_the_south(tmp_path: Path) -> None:
    """Standard time is the winter's: +10:30 on Lord Howe in January too."""
    site = SmallSite(tmp_path, "Australia/Lord_Howe").write(clock="local-standard")
    take(site, ["2026-01-01T00:00", "2026-01-01T00:15", "2026-07-01T00:00"])
    assert site.starts() == ["2025-12-31T13:30", "2025-12-31T13:45", "2026-06-30T13:30"]


@pytest.mark.parametrize("printed", ["24:00", "24:00:00"])
def test_hour_24(tmp_path: Path, printed: str) -> None:
    """Midnight at the day's end, also at the end of a year."""
    seconds = ":00" if printed.count(":") == 2 else ""
    site = SmallSite(tmp_path, "Europe/Athens").write(clock="local", stamp="end")
    last, first = f"2026-12-31 23:45{seconds}", f"2027-01-01 00:15{seconds}"
    outcome = take(site, [last, f"2026-12-31 {printed}", first])
    assert counts(outcome) == (3, 3, 0, 0, 0)
    assert site.starts() == ["2026-12-31T21:30", "2026-12-31T21:45", "2026-12-31T22:00"]


@pytest.mark.parametrize("printed", ["24:15", "25:00", "23:60"])
def test_no_hour_beyond_24(tmp_path: Path, printed: str) -> None:
    """What no clock shows is rejected."""
    site = SmallSite(tmp_path).write()
    outcome = take(site, ["2026-10-01T23:30", "2026-10-01T23:45", f"2026-10-01T{printed}"])
    assert counts(outcome) == (3, 2, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == 4


ZONES = {
    "lisbon": ("Europe/Lisbon", "2026-10-25", "01", "2026-10-25T00:00", 60),
    "new-york": ("America/New_York", "2026-11-01", "01", "2026-11-01T05:00", 60),
}


@pytest.mark.parametrize("zone", list(ZONES))
@pytest.mark.parametrize("minutes", [60, 15, 5])
@pytest.mark.parametrize("newest_first", [False, True])
@pytest.mark.parametrize("marks", ["start", "end"])
def test_autumn(tmp_path: Path, zone: str, minutes: int, newest_first: bool, marks: str) -> None:
    """The hour printed twice, with one hour before and after it: every instant once."""
    name, date, hour, first, twice = ZONES[zone]
    per_hour = twice // minutes
    clocks = [f"{date}T{h:02d}:{m:02d}" for h in (0, 1, 1, 2) for m in range(0, 60, minutes)]
    assert clocks[per_hour].endswith(f"{hour}:00")
    if marks == "end":
        # The same intervals by their ends: the first hour ends at 02:00, which is 01:00 then.
        ends = [0 * 60 + m for m in range(minutes, 61, minutes)]
        ends += 2 * [60 + m for m in range(minutes, 61, minutes)]
        ends += [120 + m for m in range(minutes, 61, minutes)]
        clocks = [f"{date}T{e // 60:02d}:{e % 60:02d}" for e in ends]
    site = SmallSite(tmp_path, name).write(clock="local", stamp=marks)
    outcome = take(site, reversed(clocks) if newest_first else clocks)
    assert counts(outcome) == (len(clocks), len(clocks), 0, 0, 0), outcome["rejects"]
    start = datetime.fromisoformat(first) - timedelta(hours=1)
    wanted = run_of(start.isoformat(), len(clocks), minutes)
    assert site.starts() == wanted
    in_order = range(1, len(clocks) + 1)
    assert site.stored("i_a") == [
        [float(n)] for n in (reversed(in_order) if newest_first else in_order)
    ]


@pytest.mark.parametrize(
    ("minutes", "clocks", "first"),
    [
        (30, "01:00 01:30 01:30 02:00", "2026-04-04T14:00"),
        (15, "01:15 01:30 01:45 01:30 01:45 02:00 02:15", "2026-04-04T14:15"),
        (5, "01:55 01:30 01:35 01:40 01:45 01:50 01:55 02:00", "2026-04-04T14:55"),
        (60, "00:00 01:00 01:30 02:30", "2026-04-04T13:00"),
    ],
)
def test_autumn_of_half_an_hour(tmp_path: Path, minutes: int, clocks: str, first: str) -> None:
    """Lord Howe goes back by 30 minutes."""
    site = SmallSite(tmp_path, "Australia/Lord_Howe").write(clock="local")
    stamps = day("2026-04-05", clocks)
    assert counts(take(site, stamps)) == (len(stamps), len(stamps), 0, 0, 0)
    assert site.starts() == run_of(first, len(stamps), minutes)


SPRING = (
    ("Europe/Lisbon", "2026-03-29", "00:30 00:45 02:00 02:15", "2026-03-29T00:30", "01:30"),
    ("America/New_York", "2026-03-08", "01:30 01:45 03:00 03:15", "2026-03-08T06:30", "02:00"),
    ("Australia/Lord_Howe", "2026-10-04", "01:30 01:45 02:30 02:45", "2026-10-03T15:00", "02:15"),
)


@pytest.mark.parametrize(("zone", "date", "clocks", "first", "never"), SPRING)
def test_spring(tmp_path: Path, zone: str, date: str, clocks: str, first: str, never: str) -> None:
    """The skipped times are no gap; a row that prints one is rejected."""
    site = SmallSite(tmp_path, zone).write(clock="local")
    stamps = day(date, clocks)
    outcome = take(site, [*stamps[:2], f"{date}T{never}", *stamps[2:]])
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == 4
    assert "does not exist" in outcome["rejects"][0]["reason"]
    assert site.starts() == run_of(first, 4, 15)


def test_spring_by_end_stamps(tmp_path: Path) -> None:
    """The instant of the change itself ends an interval."""
    site = SmallSite(tmp_path).write(clock="local", stamp="end")
    outcome = take(site, day("2026-03-29", "00:45 01:00 02:15 02:30"))
    assert counts(outcome) == (4, 4, 0, 0, 0)
    assert site.starts() == run_of("2026-03-29T00:30", 4, 15)


#: Clock readings over Lisbon's autumn, and the start of each in quarter hours after 00:00 UTC
#: (01:00 the first time is 0, 01:00 the second time is 4).
AROUND_THE_REPEATED_HOUR = {
    "whole": ("00:45 01:00 01:15 01:30 01:45 01:00 01:15 01:30 01:45 02:00",
              [-1, 0, 1, 2, 3, 4, 5, 6, 7, 8]),
    "gap-before": ("00:30 01:15 01:30 01:45 01:00 01:15 01:30 01:45 02:00",
                   [-2, 1, 2, 3, 4, 5, 6, 7, 8]),
    "gap-after": ("00:45 01:00 01:15 01:30 01:45 01:00 01:15 01:30 02:15",
                  [-1, 0, 1, 2, 3, 4, 5, 6, 9]),
    "gap-over-all-of-it": ("00:30 00:45 02:00 02:15", [-2, -1, 8, 9]),
    "gap-at-the-end-of-the-first": ("00:45 01:00 01:15 01:00 01:15 01:30 01:45 02:00",
                                    [-1, 0, 1, 4, 5, 6, 7, 8]),
    "gap-of-most-of-the-first": ("00:45 01:00 01:00 01:15 01:30 01:45 02:00",
                                 [-1, 0, 4, 5, 6, 7, 8]),
    "gap-inside-the-first": ("00:45 01:00 01:45 01:00 01:15 01:30 01:45 02:00",
                             [-1, 0, 3, 4, 5, 6, 7, 8]),
    "gap-inside-the-second": ("00:45 01:00 01:15 01:30 01:45 01:00 01:45 02:00",
                              [-1, 0, 1, 2, 3, 4, 7, 8]),
    "gap-at-the-start-of-the-second": ("00:45 01:00 01:15 01:30 01:45 01:30 01:45 02:00",
                                       [-1, 0, 1, 2, 3, 6, 7, 8]),
    "begins-within": ("01:15 01:30 01:45 01:00 01:15 01:30 01:45 02:00",
                      [1, 2, 3, 4, 5, 6, 7, 8]),
    "ends-within": ("00:45 01:00 01:15 01:30 01:45 01:00 01:15", [-1, 0, 1, 2, 3, 4, 5]),
    "first-only": ("00:30 00:45 01:00 01:15 01:30 01:45", [-2, -1, 0, 1, 2, 3]),
    "second-only": ("01:00 01:15 01:30 01:45 02:00 02:15", [4, 5, 6, 7, 8, 9]),
}  # fmt: skip


@pytest.mark.parametrize("case", list(AROUND_THE_REPEATED_HOUR))
@pytest.mark.parametrize("newest_first", [False, True])
def test_gaps_around_the_repeated_hour(tmp_path: Path, case: str, newest_first: bool) -> None:
    """The place where the printed clock falls back tells the first hour from the second."""
    clocks, quarters = AROUND_THE_REPEATED_HOUR[case]
    stamps = day("2026-10-25", clocks)
    site = SmallSite(tmp_path).write(clock="local")
    outcome = take(site, reversed(stamps) if newest_first else stamps)
    assert counts(outcome) == (len(stamps), len(stamps), 0, 0, 0), outcome["rejects"]
    zero = datetime(2026, 10, 25)
    assert site.starts() == [
        (zero + timedelta(minutes=15 * n)).isoformat(timespec="minutes") for n in quarters
    ]


def test_broken_row_inside_the_repeated_hour(tmp_path: Path) -> None:
    """It costs its own interval only."""
    stamps = day("2026-10-25", "00:45 01:00 01:15 xx:30 01:45 01:00 01:15 01:30 01:45 02:00")
    site = SmallSite(tmp_path).write(clock="local")
    outcome = take(site, stamps)
    assert counts(outcome) == (10, 9, 0, 0, 1)
    whole = run_of("2026-10-24T23:45", 10, 15)
    assert site.starts() == [*whole[:3], *whole[4:]]


def test_repeated_row_inside_the_repeated_hour(tmp_path: Path) -> None:
    """A row printed again right after itself is that very interval again."""
    clocks = "00:45 01:00 01:15 01:30 01:30 01:45 01:00 01:15 01:30 01:45 02:00"
    site = SmallSite(tmp_path).write(clock="local")
    outcome = take(site, day("2026-10-25", clocks))
    assert counts(outcome) == (11, 10, 1, 0, 0)
    assert site.starts() == run_of("2026-10-24T23:45", 10, 15)


def test_out_of_order_block_over_the_change(tmp_path: Path) -> None:
    """Both hours, as a block that was appended late."""
    clocks = "00:30 00:45 02:00 02:15 01:00 01:15 01:30 01:45 01:00 01:15 01:30 01:45"
    site = SmallSite(tmp_path).write(clock="local")
    assert counts(take(site, day("2026-10-25", clocks))) == (12, 12, 0, 0, 0)
    assert site.starts() == run_of("2026-10-24T23:30", 12, 15)


def test_lone_stamp_that_nothing_settles(tmp_path: Path) -> None:
    """An appended stamp of the repeated hour with no neighbour to tell which is rejected."""
    site = SmallSite(tmp_path).write(clock="local")
    outcome = take(site, day("2026-10-25", "00:30 00:45 03:00 03:15 01:30"))
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert "twice" in outcome["rejects"][0]["reason"]
