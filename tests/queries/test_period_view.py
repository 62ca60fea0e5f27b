"""Periods: where they begin, hold, end, and what they then say of themselves."""

from __future__ import annotations

import random
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from stored_readings import Reading, powers, small_site, view

FIRST = datetime(2026, 3, 10, 8)
STEP = timedelta(minutes=15)
#: P and Q of whole-number triangles. The default rule begins below 0.95 and ends at 0.96.
LOW = (60.0, 80.0)  # 0.6
LOWER = (56.0, 192.0)  # 0.28
BETWEEN = (165.0, 52.0)  # 0.9538: neither begins nor ends
LEAVES = (96.0, 28.0)  # 0.96
GOOD = (80.0, 18.0)  # 0.9756
IDLE = (6.0, 8.0)  # 0.6, at 10 kVA: under a tenth of the rating's 138.6 kVA
LEADS = (60.0, -80.0)


def periods(folder: Path, readings: list[Reading], kind: str, **site: Any) -> list[dict[str, Any]]:
    with small_site(folder, readings, interval_min=15, **site) as store:
        return [row for row in view(store, "period") if row["kind"] == kind]


def spans(rows: list[dict[str, Any]]) -> list[tuple[int, int]]:
    """First interval and the one after the last, counted from FIRST."""
    return [((r["start_utc"] - FIRST) // STEP, (r["end_utc"] - FIRST) // STEP) for r in rows]


def test_a_period_begins_holds_and_ends_by_two_thresholds(tmp_path: Path) -> None:
    pairs = [BETWEEN, LOW, BETWEEN, BETWEEN, LOWER, LEAVES, BETWEEN, GOOD]
    rows = periods(tmp_path, powers(FIRST, 15, *pairs), "low-pf")
    assert spans(rows) == [(1, 5)]
    row = rows[0]
    assert row["intervals"] == 4
    assert row["hours"] == 1.0
    assert row["worst"] == pytest.approx(0.28)
    assert row["mean"] is None, "a power factor is never averaged"
    assert row["energy_kwh"] == pytest.approx((60 + 165 + 165 + 56) / 4)
    assert row["net_reactive_kvarh"] == pytest.approx((80 + 52 + 52 + 192) / 4)
    # tan(arccos 0.95) = 0.328684: 165 kW with 52 kvar is under it and adds nothing.
    assert row["kvarh_above_target"] == pytest.approx((80 + 192 - 116 * 0.3286841052) / 4)


@pytest.mark.parametrize(("count", "expected"), [(3, []), (4, [(1, 5)])])
def test_shorter_than_an_hour_is_no_period(
    tmp_path: Path, count: int, expected: list[tuple[int, int]]
) -> None:
    pairs = [GOOD, *[LOW] * count, GOOD]
    assert spans(periods(tmp_path, powers(FIRST, 15, *pairs), "low-pf")) == expected


def test_the_service_may_set_its_own_rule(tmp_path: Path) -> None:
    own = "[service.periods.low-pf]\nenter = 0.5\nleave = 0.61\nminimum_min = 30"
    pairs = [LOW, LOWER, LOW, LOW, BETWEEN, LOW]
    rows = periods(tmp_path, powers(FIRST, 15, *pairs), "low-pf", service=own)
    assert spans(rows) == [(1, 4)]


def test_light_load_ends_a_period(tmp_path: Path) -> None:
    pairs = [*[LOW] * 4, IDLE, *[LOW] * 4]
    assert spans(periods(tmp_path, powers(FIRST, 15, *pairs), "low-pf")) == [(0, 4), (5, 9)]


def test_an_unknown_power_factor_ends_a_period(tmp_path: Path) -> None:
    pairs = [*[LOW] * 4, (60.0, None), *[LOW] * 5]
    assert spans(periods(tmp_path, powers(FIRST, 15, *pairs), "low-pf")) == [(0, 4), (5, 10)]


def test_a_gap_ends_a_period_and_a_new_one_has_to_begin_anew(tmp_path: Path) -> None:
    pairs = [*[LOW] * 4, None, BETWEEN, *[LOW] * 4, None, *[LOW] * 4]
    rows = periods(tmp_path, powers(FIRST, 15, *pairs), "low-pf")
    assert spans(rows) == [(0, 4), (6, 10), (11, 15)]


def test_lagging_and_leading_are_two_kinds(tmp_path: Path) -> None:
    pairs = [*[LOW] * 4, *[LEADS] * 4, *[(-60.0, -80.0)] * 4]
    with small_site(tmp_path, powers(FIRST, 15, *pairs), interval_min=15) as store:
        rows = view(store, "period")
    found = {kind: spans([r for r in rows if r["kind"] == kind]) for kind in ("low-pf", "leading")}
    # Out and lagging is quadrant III: its P·Q is positive.
    assert found == {"low-pf": [(0, 4), (8, 12)], "leading": [(4, 8)]}


def test_a_period_belongs_to_the_month_of_its_start(tmp_path: Path) -> None:
    # 1 April begins at 23:00 UTC in Lisbon.
    readings = powers(datetime(2026, 3, 31, 22, 30), 15, *[LOW] * 8)
    with small_site(tmp_path, readings, interval_min=15, zone="Europe/Lisbon") as store:

        def in_month(month: str) -> list[dict[str, Any]]:
            return store.rows("period/of_service", service="main", kind="low-pf", month=month)

        assert [row["start_local"] for row in in_month("2026-03")] == [
            datetime(2026, 3, 31, 23, 30)
        ]
        assert in_month("2026-03")[0]["hours"] == 2.0
        assert in_month("2026-04") == []


def test_hours_are_true_hours_over_the_clock_change(tmp_path: Path) -> None:
    readings = powers(datetime(2026, 10, 25, 0, 0), 15, *[LOW] * 8)
    rows = periods(tmp_path, readings, "low-pf", zone="Europe/Lisbon")
    assert [(row["hours"], row["start_local"]) for row in rows] == [
        (2.0, datetime(2026, 10, 25, 1, 0))
    ]


def volts_and_amperes(*intervals: tuple[tuple[float, ...], tuple[float, ...]]) -> list[Reading]:
    rows = []
    for place, (volts, amperes) in enumerate(intervals):
        values: dict[str, float | None] = {"p_kw": 50.0, "q_kvar": 5.0}
        for phase, v, i in zip("abc", volts, amperes, strict=True):
            values |= {f"v_{phase}": v, f"i_{phase}": i}
        rows.append((FIRST + place * STEP, values))
    return rows


EVEN_V, EVEN_A = (230.0, 230.0, 230.0), (100.0, 100.0, 100.0)


def test_overload_names_the_phase_at_its_worst(tmp_path: Path) -> None:
    currents = [(100.0,) * 3, (201.0, 190.0, 190.0), (150.0, 191.0, 220.0), (190.0,) * 3]
    readings = volts_and_amperes(*((EVEN_V, amperes) for amperes in currents))
    rows = periods(tmp_path, readings, "overload")
    # Begins above 200 A, ends at 95 % of it: 190 A.
    assert spans(rows) == [(1, 3)]
    assert (rows[0]["phase"], rows[0]["worst"]) == ("c", pytest.approx(1.1))
    assert rows[0]["mean"] == pytest.approx((1.005 + 1.1) / 2)


def test_current_imbalance_needs_load(tmp_path: Path) -> None:
    # Mean 100 A, b 30 A from it; at a quarter of that load the floor of 30 % hides it.
    heavy, light = (80.0, 130.0, 90.0), (20.0, 32.5, 22.5)
    readings = volts_and_amperes(
        *((EVEN_V, amperes) for amperes in [*[heavy] * 4, *[light] * 4, EVEN_A])
    )
    rows = periods(tmp_path, readings, "current-imbalance")
    assert spans(rows) == [(0, 4)]
    assert rows[0]["phase"] == "b"
    assert rows[0]["worst"] == pytest.approx(0.3, rel=1e-6)
    assert rows[0]["mean"] == pytest.approx(0.3, rel=1e-6)


def test_voltage_outside_its_band(tmp_path: Path) -> None:
    # 0.9 and 1.1 of 230.94 V are 207.85 and 254.03 V; back inside by 0.005: 209.00 V.
    low, back, high = (230.0, 200.0, 230.0), (230.0, 208.5, 230.0), (230.0, 230.0, 256.0)
    readings = volts_and_amperes(
        *((volts, EVEN_A) for volts in [EVEN_V, low, back, EVEN_V, high, EVEN_V])
    )
    rows = periods(tmp_path, readings, "voltage")
    assert spans(rows) == [(1, 3), (4, 5)]
    assert [row["phase"] for row in rows] == ["b", "c"]
    assert rows[0]["worst"] == pytest.approx(200 / 230.9401076758503)
    assert rows[1]["worst"] == pytest.approx(256 / 230.9401076758503)


def test_voltage_imbalance_by_the_profile_of_limits(tmp_path: Path) -> None:
    # |V2|/|V1| of 214, 230, 230 V at 120° is 16/674 = 2.4 %, over 2 %.
    readings = volts_and_amperes(*(((214.0, 230.0, 230.0), EVEN_A) for _ in range(4)))
    rows = periods(tmp_path, readings, "voltage-imbalance")
    assert spans(rows) == [(0, 4)]
    assert rows[0]["worst"] == pytest.approx(16 / 674, rel=1e-6)


def plain_runs(readings: list[Reading]) -> list[tuple[int, int]]:
    """Low-PF periods of a record by a plain loop over its intervals."""
    runs: list[list[int]] = []
    inside, before = False, None
    for start, values in readings:
        place = (start - FIRST) // STEP
        p, q = values["p_kw"], values["q_kvar"]
        if before is None or place != before + 1:
            inside = False
        pf = None
        if p is not None and q is not None:
            apparent = (p * p + q * q) ** 0.5
            if apparent >= 0.1 * 138.564064605510 and p * q > 0:
                pf = abs(p) / apparent
        was = inside
        inside = pf is not None and (pf < 0.95 or (inside and pf < 0.96))
        if inside and was:
            runs[-1][1] = place + 1
        elif inside:
            runs.append([place, place + 1])
        before = place
    return [(first, end) for first, end in runs if end - first >= 4]


@pytest.mark.parametrize("seed", range(4))
def test_random_record_equals_a_plain_loop(tmp_path: Path, seed: int) -> None:
    chance = random.Random(seed)
    kinds = [LOW, LOWER, BETWEEN, LEAVES, GOOD, IDLE, LEADS, (60.0, None), None]
    weights = [30, 10, 30, 2, 2, 1, 1, 1, 2]
    pairs = chance.choices(kinds, weights, k=400)
    readings = powers(FIRST, 15, *pairs)
    expected = plain_runs(readings)
    assert len(expected) > 5
    assert spans(periods(tmp_path, readings, "low-pf")) == expected
