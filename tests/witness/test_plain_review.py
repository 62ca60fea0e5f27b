"""The witness itself under test: hand calculation, planted outcomes, planted phasors."""

from __future__ import annotations

import math
from datetime import datetime, timedelta
from pathlib import Path

import awkward_export
import other_exports
import pytest
from plain_power import Service, Values, derive
from plain_reader import ExportMap, Row, read_export, utc_candidates
from plain_review import (
    demand_windows,
    derive_all,
    gaps,
    iso_local,
    minutes_of_month,
    percentile,
    review,
)

TINY_MAP = ExportMap(zone="Europe/Helsinki", columns=(), pf_convention="unsigned")
TINY = Service(nominal_voltage_v=400.0, rating_a=100.0)
FIRST = datetime(2025, 6, 2, 9, 0)


def tiny_row(v: float, i: float, pf: float) -> Row:
    """A balanced row."""
    return {f"{kind}_{k}": x for kind, x in (("v", v), ("i", i), ("pf", pf)) for k in "abc"}


def test_balanced_interval_by_hand() -> None:
    """3 × 200 V × 10 A at 0.8: 4.8 kW, 3.6 kvar, 6 kVA; Z = 20 Ω: 16 + j12, delta 48 + j36."""
    x = derive(tiny_row(200.0, 10.0, 0.8), TINY_MAP, TINY)
    expected = {
        "p_kw": 4.8,
        "q_kvar": 3.6,
        "s_vector_kva": 6.0,
        "s_arithmetic_kva": 6.0,
        "s_effective_kva": 6.0,
        "r_wye_a_ohm": 16.0,
        "x_wye_b_ohm": 12.0,
        "r_delta_ohm": 48.0,
        "x_delta_ohm": 36.0,
        "pf_vector": 0.8,
        "pf_effective": 0.8,
    }
    for name, value in expected.items():
        assert x[name] == pytest.approx(value, rel=1e-12), name
    for name in ("vuf", "lvur", "pvur", "iuf2", "iuf0", "current_unbalance", "i_n_a"):
        assert x[name] == pytest.approx(0.0, abs=1e-12), name


def test_one_loaded_phase_by_hand() -> None:
    """One phase at 12 A: all of it returns in the neutral, each sequence part is 4 A."""
    row = tiny_row(200.0, 0.0, 1.0)
    row["i_a"] = 12.0
    row["pf_b"] = row["pf_c"] = None
    x = derive(row, TINY_MAP, TINY)
    assert x["i_n_a"] == pytest.approx(12.0)
    assert x["iuf2"] == pytest.approx(1.0)
    assert x["iuf0"] == pytest.approx(1.0)
    assert x["current_unbalance"] == pytest.approx(2.0)  # 12 from a mean of 4 is 8, over 4
    assert x["s_effective_kva"] == pytest.approx(0.6 * math.sqrt(2.0 * 144.0 / 3.0))
    assert x["p_b_kw"] == 0.0
    assert x["pf_b"] is None
    assert x["x_delta_ohm"] == pytest.approx(0.0, abs=1e-12)
    assert x["r_delta_ohm"] == pytest.approx(150.0)  # 3 × 200 V over 4 A


def test_voltage_imbalance_by_hand() -> None:
    """200, 200, 230 V: |V₂| = 10, |V₁| = 210; L-N deviation 20 of 210."""
    row = tiny_row(200.0, 10.0, 1.0)
    row["v_c"] = 230.0
    x = derive(row, TINY_MAP, TINY)
    assert x["vuf"] == pytest.approx(10.0 / 210.0)
    assert x["pvur"] == pytest.approx(20.0 / 210.0)
    lines = (math.sqrt(3.0) * 200.0, *[math.sqrt(200.0**2 + 230.0**2 + 200.0 * 230.0)] * 2)
    mean = sum(lines) / 3.0
    assert x["lvur"] == pytest.approx((mean - lines[0]) / mean)


def test_review_by_hand() -> None:
    """Four quarter hours of 4.8, 4.8, 9.6 and 0 kW: sums, peak, load factor."""
    amps = (10.0, 10.0, 20.0, 0.0)
    intervals = {
        FIRST + n * timedelta(minutes=15): tiny_row(200.0, i, 0.8) for n, i in enumerate(amps)
    }
    zone = TINY_MAP.zone
    month = review(derive_all(intervals, TINY_MAP, TINY), zone, 15, TINY)["2025-06"]
    assert month["energy_kwh"] == pytest.approx(4.8)
    assert month["reactive_lagging_kvarh"] == pytest.approx(3.6)
    assert month["pf_energy_weighted"] == pytest.approx(0.8)
    assert month["peak_demand_kw"] == pytest.approx(9.6)
    assert month["peak_demand_start"] == "2025-06-02T12:30:00+03:00"
    assert month["load_factor"] == pytest.approx(0.5)
    assert month["low_pf_hours"] == 0.75
    assert month["completeness"] == pytest.approx(60.0 / (30 * 1440))
    assert month["kvarh_above_target"] == pytest.approx(3.6 - 4.8 * math.tan(math.acos(0.95)))
    assert month["peak_current_utilisation"] == pytest.approx(0.2)
    assert month["voltage_max_pu"] == pytest.approx(200.0 * math.sqrt(3.0) / 400.0)
    assert month["hours_outside_voltage_band"] == 1.0


def powers(first: datetime, values: list[float]) -> dict[datetime, Values]:
    """Quarter hours with a plain kW and no kvar."""
    return {
        first + n * timedelta(minutes=15): {"p_kw": p, "q_kvar": 0.0} for n, p in enumerate(values)
    }


def test_windows_by_hand() -> None:
    """Block windows stand on the clock, sliding ones on every interval, holes end both."""
    block = Service(demand_window_min=30)
    sliding = Service(demand_window_min=30, demand_kind="sliding")
    some = powers(FIRST + timedelta(minutes=15), [1.0, 9.0, 2.0, 5.0, 7.0])
    assert [w[1] for w in demand_windows(some, "UTC", 15, block)] == [5.5, 6.0]
    assert [w[1] for w in demand_windows(some, "UTC", 15, sliding)] == [5.0, 5.5, 3.5, 6.0]
    some[FIRST + timedelta(minutes=30)]["p_kw"] = None
    assert [w[1] for w in demand_windows(some, "UTC", 15, block)] == [6.0]
    assert [w[1] for w in demand_windows(some, "Asia/Kathmandu", 15, block)] == [3.5]


def test_calendar_and_percentile_by_hand() -> None:
    """Months with a clock change, the repeated and the missing hour, interpolation."""
    assert minutes_of_month("2025-10", "Europe/Helsinki") == 31 * 1440 + 60
    assert minutes_of_month("2025-03", "Europe/Berlin") == 31 * 1440 - 60
    assert minutes_of_month("2025-12", "Europe/Berlin") == 31 * 1440
    helsinki = ExportMap(zone="Europe/Helsinki", columns=())
    assert utc_candidates(datetime(2025, 10, 26, 3, 30), helsinki) == [
        datetime(2025, 10, 26, 0, 30),
        datetime(2025, 10, 26, 1, 30),
    ]
    assert utc_candidates(datetime(2025, 10, 26, 4, 0), helsinki) == [datetime(2025, 10, 26, 2, 0)]
    assert utc_candidates(datetime(2025, 3, 30, 3, 30), helsinki) == []
    assert iso_local(datetime(2025, 10, 26, 0, 30), "Europe/Helsinki").endswith("03:30:00+03:00")
    assert percentile([4.0, 1.0, 3.0, 2.0], 0.95) == pytest.approx(3.85)
    assert percentile([], 0.95) is None


ALL_BUILDERS = other_exports.BUILDERS | {
    "lone": other_exports.lone_repeated_stamp,
    "assumed": other_exports.assumed_sign,
}


@pytest.mark.parametrize("name", sorted(ALL_BUILDERS))
def test_reader_finds_what_was_planted(name: str, tmp_path: Path) -> None:
    """Each line's outcome and impossible values, as planted by hand."""
    export = ALL_BUILDERS[name](tmp_path)
    reading = read_export(export.file.read_bytes(), export.export_map)
    planted = export.planted
    assert {n: line.outcome for n, line in planted.items() if line.outcome} == reading.outcomes
    bad = [(n, key) for n, line in planted.items() for key in line.impossible]
    assert sorted(bad) == sorted(reading.value_rejects)
    counts = (reading.rows_stored, reading.rows_replaced, reading.rows_duplicate)
    assert sum(counts) + reading.rows_rejected == reading.rows_read
    usable = {line.start for line in planted.values() if line.outcome != "rejected" and line.start}
    assert set(reading.intervals) == usable


@pytest.mark.parametrize("name", sorted(other_exports.BUILDERS))
def test_power_is_that_of_the_planted_phasors(name: str, tmp_path: Path) -> None:
    """P + jQ of each phase is V·I* of what was planted, wherever the row was left alone."""
    export = ALL_BUILDERS[name](tmp_path)
    reading = read_export(export.file.read_bytes(), export.export_map)
    derived = derive_all(reading.intervals, export.export_map, export.service)
    spoilt = set(awkward_export.CELL_FAULTS) | export.loose if name == "awkward" else set()
    again = [line.start for line in export.planted.values() if line.outcome == "replaced"]
    bad = [line.start for line in export.planted.values() if line.impossible]
    alone = [start for start in derived if start not in spoilt.union(again, bad)]
    assert len(alone) > 500
    for start in alone:
        for k, power in zip("abc", export.truth[start].power_kva(), strict=True):
            assert derived[start][f"p_{k}_kw"] == pytest.approx(power.real, rel=1e-9, abs=1e-9)
            assert derived[start][f"q_{k}_kvar"] == pytest.approx(power.imag, rel=1e-9, abs=1e-6)


def test_awkward_export_holds_what_it_promises(tmp_path: Path) -> None:
    """The planted extremes are the extremes, and no interval sits on a threshold."""
    export = awkward_export.build(tmp_path)
    service, zone = export.service, awkward_export.ZONE
    reading = read_export(export.file.read_bytes(), export.export_map)
    derived = derive_all(reading.intervals, export.export_map, service)
    october = review(derived, zone, 15, service)["2025-10"]
    assert october["peak_demand_start"] == "2025-10-21T10:15:00+03:00"
    assert october["peak_demand_kva_start"] == "2025-10-22T10:15:00+03:00"
    assert october["hours_outside_voltage_band"] == 1.0
    assert [n for _, _, n in gaps(list(derived), 15)] == [5, 11]
    factors = [abs(pf) for x in derived.values() if (pf := x["pf_vector"]) is not None]
    assert min(abs(pf - service.target_pf) for pf in factors) > 1e-6
    floor = derived[awkward_export.at("2025-10-22", "13:15")]
    assert floor["pf_a"] is not None
    partly = derived[awkward_export.at("2025-10-22", "13:30")]
    assert partly["pf_a"] is None
    assert partly["pf_vector"] is not None
    under = derived[awkward_export.at("2025-10-22", "13:45")]
    assert under["pf_vector"] is None
    assert under["vuf"] is None
    assert under["p_kw"] is not None
    light = sum(x["pf_vector"] is None for x in derived.values())
    assert light > 10
    assert october["leading_hours"] > 10.0


def test_peaks_of_the_other_exports(tmp_path: Path) -> None:
    """No incomplete window peaks; a sliding window belongs to the month of its start."""
    for name, month, start in (
        ("newest-first", "2025-10", None),
        ("utc-iso", "2025-03", "2025-03-31T23:45:00+03:00"),
    ):
        export = ALL_BUILDERS[name](tmp_path / name)
        reading = read_export(export.file.read_bytes(), export.export_map)
        derived = derive_all(reading.intervals, export.export_map, export.service)
        found = review(derived, export.export_map.zone, 15, export.service)[month]
        if start is None:
            assert "2025-10-28T12:30" not in str(found["peak_demand_start"])
            assert found["peak_demand_start"][14:16] in ("00", "30")
        else:
            assert found["peak_demand_start"] == start
