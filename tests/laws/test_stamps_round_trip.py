"""Local stamps of a record over a clock change come back to the instants they were made of."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from meterlens.store.timestamps import NOT_A_TIME, read_stamps

ZONES = {
    "Europe/Lisbon": (datetime(2026, 10, 24, 12), datetime(2026, 3, 28, 12)),
    "America/New_York": (datetime(2026, 10, 31, 18), datetime(2026, 3, 7, 18)),
    "Australia/Lord_Howe": (datetime(2026, 4, 4, 6), datetime(2026, 10, 3, 6)),
    "Africa/Casablanca": (datetime(2026, 2, 14, 12), datetime(2026, 3, 21, 12)),
}


def microseconds(instant: datetime) -> int:
    return int((instant - datetime(1970, 1, 1)).total_seconds()) * 1_000_000


def record(zone: str, first: datetime, minutes: int, stamp: str) -> tuple[np.ndarray, np.ndarray]:
    """True UTC starts over a day and a half, and the local stamps that a meter prints."""
    starts, printed = [], []
    for k in range(36 * 60 // minutes):
        start = first + timedelta(minutes=minutes * k)
        shown = start + timedelta(minutes=minutes if stamp == "end" else 0)
        local = shown.replace(tzinfo=UTC).astimezone(ZoneInfo(zone)).replace(tzinfo=None)
        starts.append(microseconds(start))
        printed.append(microseconds(local))
    return np.array(starts), np.array(printed)


@pytest.mark.parametrize("zone", ZONES)
@pytest.mark.parametrize("change", [0, 1])
@pytest.mark.parametrize("stamp", ["start", "end"])
@pytest.mark.parametrize("minutes", [1, 5, 15, 30, 60])
@pytest.mark.parametrize("direction", [1, -1])
def test_whole_record(zone: str, change: int, stamp: str, minutes: int, direction: int) -> None:
    starts, printed = record(zone, ZONES[zone][change], minutes, stamp)
    reading = read_stamps(printed[::direction], "local", stamp, zone, minutes)
    np.testing.assert_array_equal(reading.start_utc[::direction], starts)
    assert reading.either_way == 0


@given(
    zone=st.sampled_from(sorted(ZONES)),
    stamp=st.sampled_from(["start", "end"]),
    direction=st.sampled_from([1, -1]),
    missing=st.sets(st.integers(0, 143), max_size=6),
    again=st.lists(st.integers(0, 143), max_size=4),
)
def test_scattered_holes_and_repeated_lines(
    zone: str, stamp: str, direction: int, missing: set[int], again: list[int]
) -> None:
    """A few missing rows and lines printed twice never put a reading into the other hour."""
    starts, printed = record(zone, ZONES[zone][0], 15, stamp)
    rows = sorted([k for k in range(len(starts)) if k not in missing] + again)
    starts, printed = starts[rows], printed[rows]
    reading = read_stamps(printed[::direction], "local", stamp, zone, 15)
    found = reading.start_utc[::direction]
    decided = found != NOT_A_TIME
    if reading.either_way == 0:
        np.testing.assert_array_equal(found[decided], starts[decided])
    # Far from the change nothing is in doubt.
    assert decided[:20].all()
    assert decided[-20:].all()


def test_an_hour_that_stands_once_is_its_first_pass_either_way_round() -> None:
    zone = "Europe/Lisbon"
    starts, printed = record(zone, ZONES[zone][0], 15, "start")
    change = microseconds(datetime(2026, 10, 25, 1))
    once = (starts < change) | (starts >= change + 3_600_000_000)
    for direction in (1, -1):
        reading = read_stamps(printed[once][::direction], "local", "start", zone, 15)
        np.testing.assert_array_equal(reading.start_utc[::direction], starts[once])
        assert reading.either_way == 4
