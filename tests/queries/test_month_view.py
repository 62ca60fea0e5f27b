"""A month's sums and extremes against numbers worked by hand."""

from __future__ import annotations

from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from stored_readings import Reading, powers, small_site, view

HOUR = timedelta(hours=1)
FIRST = datetime(2026, 10, 5)
#: tan(arccos 0.95) and 400 V over the root of 3, to the digits of a pocket calculator.
TANGENT, LINE_TO_NEUTRAL_V = 0.3286841051788632, 230.9401076758503


def reading(
    place: int,
    p: float | None,
    q: float | None,
    volts: tuple[float, float, float],
    amperes: tuple[float, float, float],
) -> Reading:
    values: dict[str, float | None] = {"p_kw": p, "q_kvar": q}
    for phase, v, i in zip("abc", volts, amperes, strict=True):
        values |= {f"v_{phase}": v, f"i_{phase}": i}
    return FIRST + place * HOUR, values


HOURLY = [
    reading(0, 30.0, 40.0, (230.0, 231.0, 229.0), (70.0, 71.0, 72.0)),
    reading(1, 40.0, -30.0, (200.0, 230.0, 230.0), (70.0, 120.0, 60.0)),  # low voltage
    reading(2, -40.0, -30.0, (230.0, 230.0, 260.0), (80.0, 80.0, 80.0)),  # out, high voltage
    reading(3, 100.0, 0.0, (230.0, 230.0, 230.0), (110.0, 110.0, 110.0)),
    reading(4, None, None, (230.0, 230.0, 230.0), (10.0, 10.0, 10.0)),  # no power
]


@pytest.fixture
def october(tmp_path: Path) -> dict[str, Any]:
    with small_site(tmp_path, HOURLY, interval_min=60, zone="Europe/Lisbon") as store:
        rows = view(store, "month")
    assert [row["month"] for row in rows] == ["2026-10"]
    return rows[0]


@pytest.mark.parametrize(
    ("column", "expected"),
    [
        ("energy_kwh", 30 + 40 + 100),
        ("energy_export_kwh", 40),
        ("reactive_lagging_kvarh", 40),
        ("reactive_leading_kvarh", 30 + 30),
        ("apparent_kvah", 50 + 50 + 50 + 100),
        ("kvarh_above_target", 40 - 30 * TANGENT),
        # 30 + j40 and −40 − j30 lag under the target; 40 − j30 leads.
        ("low_pf_hours", 2),
        ("leading_hours", 2),
        ("peak_current_a", 120),
        ("peak_current_phase", "b"),
        ("peak_current_utilisation", 120 / 200),
        ("voltage_min_pu", 200 / LINE_TO_NEUTRAL_V),
        ("voltage_max_pu", 260 / LINE_TO_NEUTRAL_V),
        ("hours_outside_voltage_band", 2),
        ("minutes_present", 300),
        ("minutes_with_p", 240),
        # October 2026 has 744 hours and the one that the clocks repeat.
        ("completeness", 4 / 745),
    ],
)
def test_figures_of_five_hours(october: dict[str, Any], column: str, expected: float) -> None:
    assert october[column] == (
        expected if isinstance(expected, str) else pytest.approx(expected, rel=1e-12)
    )


def test_percentile_is_by_linear_interpolation(tmp_path: Path) -> None:
    # Phase a alone differs: (x, 100, 100) strays from its mean by 2|x − 100|/(x + 200).
    currents = [100.0, 103.0, 106.0, 109.0, 112.0]
    readings = [
        reading(k, 60.0, 10.0, (230.0, 230.0, 230.0), (x, 100.0, 100.0))
        for k, x in enumerate(currents)
    ]
    with small_site(tmp_path, readings, interval_min=60) as store:
        row = view(store, "month")[0]
    ranked = [2 * (x - 100) / (x + 200) for x in currents]
    # Place 0.95 · 4 = 3.8 of 0 … 4.
    expected = ranked[3] + 0.8 * (ranked[4] - ranked[3])
    assert row["current_unbalance_p95"] == pytest.approx(expected, rel=1e-6)


def test_billing_kva_chooses_the_apparent_energy(tmp_path: Path) -> None:
    readings = [reading(0, 30.0, 40.0, (230.0, 230.0, 230.0), (100.0, 100.0, 100.0))]
    apparent = {}
    for kind in ("vector", "arithmetic"):
        service = f'billing_kva = "{kind}"'
        with small_site(tmp_path / kind, readings, interval_min=60, service=service) as store:
            apparent[kind] = view(store, "month")[0]["apparent_kvah"]
    assert apparent == {"vector": pytest.approx(50), "arithmetic": pytest.approx(69)}


def test_months_are_those_of_the_site_clock(tmp_path: Path) -> None:
    # 23:00 and 24:00 of 31 March in UTC are 00:00 and 01:00 of 1 April in Lisbon's summer time.
    pairs = [(float(p), 0.0) for p in (1, 2, 4, 8)]
    readings = powers(datetime(2026, 3, 31, 21), 60, *pairs)
    with small_site(tmp_path, readings, interval_min=60, zone="Europe/Lisbon") as store:
        months = {row["month"]: row for row in view(store, "month")}
        names = [row["month"] for row in store.rows("month/names")]
    assert names == ["2026-03", "2026-04"]
    assert {name: row["energy_kwh"] for name, row in months.items()} == {
        "2026-03": 3.0,
        "2026-04": 12.0,
    }
    # March loses an hour to the clock change of its last Sunday.
    assert months["2026-03"]["completeness"] == pytest.approx(2 / 743)
    assert months["2026-04"]["completeness"] == pytest.approx(2 / 720)


@pytest.mark.parametrize(("q", "hours"), [(32.8685, 1.0), (32.8684, 0.0)])
def test_at_the_target_is_not_below_it(tmp_path: Path, q: float, hours: float) -> None:
    with small_site(tmp_path, powers(FIRST, 60, (100.0, q)), interval_min=60) as store:
        assert view(store, "month")[0]["low_pf_hours"] == hours


def test_light_load_has_no_power_factor_hours_but_its_energy_counts(tmp_path: Path) -> None:
    # The floor is 2 % of 200 A: 3 kVA at nominal voltage is 4.3 A, 2 kVA is 2.9 A.
    pairs = [(1.8, 2.4), (1.2, 1.6)]
    with small_site(tmp_path, powers(FIRST, 60, *pairs), interval_min=60) as store:
        row = view(store, "month")[0]
    assert row["low_pf_hours"] == 1.0
    assert row["energy_kwh"] == pytest.approx(3.0)
    assert row["reactive_lagging_kvarh"] == pytest.approx(4.0)
