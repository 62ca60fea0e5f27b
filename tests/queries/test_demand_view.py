"""Demand windows against hand-worked numbers and a plain loop."""

from __future__ import annotations

import random
from datetime import datetime, timedelta
from pathlib import Path

import pytest
from stored_readings import Reading, powers, small_site, view

MIDNIGHT = datetime(2026, 3, 10)
#: Five-minute kW of a worked example: its 15-minute block peak is 166.7 and its 15-minute
#: rolling peak by 5 minutes is 200.
WORKED = [(p, 10.0) for p in (100.0, 100.0, 200.0, 200.0, 200.0, 100.0)]
SLIDING = 'demand_kind = "sliding"'


def test_blocks_of_the_worked_example(tmp_path: Path) -> None:
    with small_site(tmp_path, powers(MIDNIGHT, 5, *WORKED), interval_min=5) as store:
        rows = view(store, "demand")
    assert [row["start_utc"] - MIDNIGHT for row in rows] == [
        timedelta(minutes=0),
        timedelta(minutes=15),
    ]
    assert [row["p_kw"] for row in rows] == pytest.approx([400 / 3, 500 / 3])
    assert [row["q_kvar"] for row in rows] == pytest.approx([10, 10])
    assert all(row["complete"] and row["q_complete"] for row in rows)


def test_rolling_windows_of_the_worked_example(tmp_path: Path) -> None:
    readings = powers(MIDNIGHT, 5, *WORKED)
    with small_site(tmp_path, readings, interval_min=5, service=SLIDING) as store:
        rows = view(store, "demand")
        peaks = store.rows("month/peak_demand", service="main", month="2026-03")
    complete = [row for row in rows if row["complete"]]
    assert [row["p_kw"] for row in complete] == pytest.approx([400 / 3, 500 / 3, 200, 500 / 3])
    # The last two windows reach past the record.
    assert len(rows) == 6
    assert [row["p_kw"] for row in rows[4:]] == pytest.approx([150, 100])
    kw = next(row for row in peaks if row["peak"] == "kw")
    assert kw["p_kw"] == pytest.approx(200)
    assert kw["start_utc"] == MIDNIGHT + timedelta(minutes=10)


@pytest.mark.parametrize("service", ["", SLIDING], ids=["block", "sliding"])
def test_incomplete_windows_set_no_peak(tmp_path: Path, service: str) -> None:
    # 00:05 is missing, 00:20 has no P, 00:35 has no Q.
    pairs: list[tuple[float | None, float | None] | None]
    pairs = [(900.0, 0.0), None, (900.0, 0.0), (800.0, 0.0), (None, 1.0), (800.0, 0.0)]
    pairs += [(60.0, 80.0), (60.0, None), (60.0, 80.0), (30.0, 40.0), (30.0, 40.0), (30.0, 40.0)]
    readings = powers(MIDNIGHT, 5, *pairs)
    with small_site(tmp_path, readings, interval_min=5, service=service) as store:
        rows = {row["start_utc"]: row for row in view(store, "demand")}
        peaks = {
            row["peak"]: row for row in store.rows("month/peak_demand", service="main", month=None)
        }
    first, third = rows[MIDNIGHT], rows[MIDNIGHT + timedelta(minutes=30)]
    assert not first["complete"]
    assert first["p_kw"] == pytest.approx(900)
    assert third["complete"]
    assert not third["q_complete"]
    # A rolling window also starts at 00:25: 800, 60 and 60 kW, the kvar of 00:35 missing.
    kw_peak, kw_at, kva_peak, kva_at = 60.0, 30, (30.0, 40.0), 45
    if service == SLIDING:
        kw_peak, kw_at, kva_peak, kva_at = 920 / 3, 25, (40.0, 160 / 3), 40
    assert peaks["kw"]["p_kw"] == pytest.approx(kw_peak)
    assert peaks["kw"]["start_utc"] == MIDNIGHT + timedelta(minutes=kw_at)
    assert peaks["kw"]["q_kvar"] is None
    assert peaks["kva"]["start_utc"] == MIDNIGHT + timedelta(minutes=kva_at)
    assert (peaks["kva"]["p_kw"], peaks["kva"]["q_kvar"]) == pytest.approx(kva_peak)


def test_ties_go_to_the_earliest(tmp_path: Path) -> None:
    pairs = [(10.0, 0.0), (70.0, 0.0), (70.0, 0.0), (20.0, 0.0)]
    with small_site(tmp_path, powers(MIDNIGHT, 15, *pairs), interval_min=15) as store:
        peaks = store.rows("month/peak_demand", service="main", month=None)
    assert {row["start_utc"] for row in peaks} == {MIDNIGHT + timedelta(minutes=15)}


def test_coarser_readings_stand_as_they_are(tmp_path: Path) -> None:
    readings = powers(MIDNIGHT, 60, (50.0, 5.0), (70.0, 5.0))
    with small_site(tmp_path, readings, interval_min=60) as store:
        rows = view(store, "demand")
    assert [(row["window_min"], row["p_kw"], row["complete"]) for row in rows] == [
        (60, 50.0, True),
        (60, 70.0, True),
    ]


def test_blocks_stand_on_the_site_clock(tmp_path: Path) -> None:
    # Kathmandu is 5:45 ahead: local midnight is 18:15 UTC, and no hour is whole in UTC.
    first = datetime(2026, 3, 31, 17, 15)
    pairs = [(float(p), 0.0) for p in (10, 20, 30, 40, 50, 60, 70, 80)]
    with small_site(
        tmp_path,
        powers(first, 15, *pairs),
        interval_min=15,
        zone="Asia/Kathmandu",
        service="demand_window_min = 60",
    ) as store:
        rows = view(store, "demand")
        peaks = store.rows("month/peak_demand", service="main", month="2026-03")
    assert [row["start_local"] for row in rows] == [
        datetime(2026, 3, 31, 23),
        datetime(2026, 4, 1, 0),
    ]
    assert [row["p_kw"] for row in rows] == [25.0, 65.0]
    assert peaks[0]["start_utc"] == first


def test_a_window_belongs_to_the_month_it_starts_in(tmp_path: Path) -> None:
    first = datetime(2026, 3, 31, 23, 50)
    readings = powers(first, 5, (10.0, 0.0), (40.0, 0.0), (70.0, 0.0), (70.0, 0.0), (10.0, 0.0))
    with small_site(tmp_path, readings, interval_min=5, service=SLIDING) as store:
        peaks = store.rows("month/peak_demand", service="main", month=None)
    by_month = {row["month"]: row for row in peaks if row["peak"] == "kw"}
    assert by_month["2026-03"]["start_utc"] == first + timedelta(minutes=5)
    assert by_month["2026-03"]["p_kw"] == pytest.approx(60)
    assert by_month["2026-04"]["p_kw"] == pytest.approx(50)


def test_the_repeated_hour_has_windows_of_its_own(tmp_path: Path) -> None:
    # Lisbon, 25 October 2026: 02:00 becomes 01:00 at 01:00 UTC.
    first = datetime(2026, 10, 25, 0, 0)
    pairs = [(float(10 * k), 0.0) for k in range(1, 13)]
    with small_site(
        tmp_path,
        powers(first, 15, *pairs),
        interval_min=15,
        zone="Europe/Lisbon",
        service="demand_window_min = 30",
    ) as store:
        rows = view(store, "demand")
    assert [row["start_local"].strftime("%H:%M") for row in rows] == [
        "01:00", "01:30", "01:00", "01:30", "02:00", "02:30",
    ]  # fmt: skip
    assert [row["utc_offset_min"] for row in rows] == [60, 60, 0, 0, 0, 0]
    assert [row["p_kw"] for row in rows] == [15.0, 35.0, 55.0, 75.0, 95.0, 115.0]
    assert [row["start_utc"] for row in rows] == [
        first + timedelta(minutes=30 * k) for k in range(6)
    ]


def test_rolling_windows_run_through_the_repeated_hour(tmp_path: Path) -> None:
    first = datetime(2026, 10, 25, 0, 30)
    pairs = [(float(10 * k), 0.0) for k in range(1, 6)]
    with small_site(
        tmp_path,
        powers(first, 15, *pairs),
        interval_min=15,
        zone="Europe/Lisbon",
        service=SLIDING + "\ndemand_window_min = 30",
    ) as store:
        rows = view(store, "demand")
    assert [row["p_kw"] for row in rows if row["complete"]] == [15.0, 25.0, 35.0, 45.0]


def plain_windows(
    readings: list[Reading], interval_min: int, window_min: int, sliding: bool
) -> dict[datetime, tuple[bool, float | None]]:
    """Complete, and mean of the P there is, of every window, by going through minutes."""
    minute_kw: dict[datetime, float | None] = {}
    for start, values in readings:
        for k in range(interval_min):
            minute_kw[start + timedelta(minutes=k)] = values["p_kw"]
    starts = {start for start, _ in readings}
    if not sliding:
        length = timedelta(minutes=window_min)
        day = datetime(2026, 3, 10)
        starts = {day + ((start - day) // length) * length for start in starts}
    windows = {}
    for start in starts:
        known = [
            kw
            for k in range(window_min)
            if (kw := minute_kw.get(start + timedelta(minutes=k))) is not None
        ]
        mean = sum(known) / len(known) if known else None
        windows[start] = (len(known) == window_min, mean)
    return windows


@pytest.mark.parametrize("sliding", [False, True], ids=["block", "sliding"])
@pytest.mark.parametrize(("interval_min", "window_min"), [(1, 15), (5, 15), (10, 30), (15, 60)])
def test_random_record_equals_a_plain_loop(
    tmp_path: Path, interval_min: int, window_min: int, sliding: bool
) -> None:
    chance = random.Random(interval_min + 1000 * sliding)
    pairs = [
        None
        if chance.random() < 0.05
        else (None if chance.random() < 0.05 else round(chance.uniform(-50, 200), 3), 1.0)
        for _ in range(300)
    ]
    readings = powers(MIDNIGHT, interval_min, *pairs)
    service = f"demand_window_min = {window_min}\n" + (SLIDING if sliding else "")
    with small_site(tmp_path, readings, interval_min=interval_min, service=service) as store:
        rows = view(store, "demand")
    expected = plain_windows(readings, interval_min, window_min, sliding)
    assert {row["start_utc"] for row in rows} == set(expected)
    for row in rows:
        complete, mean = expected[row["start_utc"]]
        assert row["complete"] is complete
        assert row["p_kw"] == (None if mean is None else pytest.approx(mean))
