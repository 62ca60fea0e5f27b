"""Series on the wall clock: gaps, clock changes, interval changes, coarser grids."""

from __future__ import annotations

import base64
from datetime import datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import polars as pl
import pytest

from meterlens.report.facts import ServiceFacts
from meterlens.report.figures_record import day_shares
from meterlens.report.record import lay_out
from meterlens.report.series import Join, regular, stride
from meterlens.report.theme import pack
from meterlens.report.traces import line_traces

MEAN = {"p_kw": Join("mean")}


def record(
    start: datetime, count: int, minutes: float = 15, zone: str = "Europe/Lisbon"
) -> pl.DataFrame:
    """Return `count` intervals from `start` (naive UTC), numbered in ``p_kw``."""
    utc = pl.Series("start_utc", [start + timedelta(minutes=minutes * n) for n in range(count)])
    local = utc.dt.replace_time_zone("UTC").dt.convert_time_zone(zone).dt.replace_time_zone(None)
    return pl.DataFrame(
        {
            "start_utc": utc,
            "start_local": local.alias("start_local"),
            "interval_min": np.full(count, minutes),
            "p_kw": np.arange(count, dtype=float),
        }
    )


def unpack(packed: dict[str, str]) -> np.ndarray:
    """Decode what `pack` wrote."""
    return np.frombuffer(base64.b64decode(packed["bdata"]), f"<{packed['dtype']}")


def test_unbroken_record_is_one_segment() -> None:
    grid = regular(record(datetime(2026, 1, 5), 96), MEAN)
    (segment,) = grid.segments
    assert segment.start == datetime(2026, 1, 5)
    assert segment.step_ms == 900_000
    assert not grid.thinned
    np.testing.assert_array_equal(segment.values["p_kw"], np.arange(96, dtype=np.float32))
    assert grid.span == (datetime(2026, 1, 5), datetime(2026, 1, 6))


def test_gap_is_filled_with_nan_and_later_points_keep_their_time() -> None:
    frame = record(datetime(2026, 1, 5), 96)
    grid = regular(pl.concat([frame[:40], frame[60:]]), MEAN)
    (segment,) = grid.segments
    values = segment.values["p_kw"]
    assert np.isnan(values[40:60]).all()
    assert values[60] == 60
    assert len(segment) == 96


def test_long_gap_starts_a_segment_instead_of_filling() -> None:
    frame = record(datetime(2026, 1, 5), 5000)
    grid = regular(pl.concat([frame[:100], frame[3000:]]), MEAN)
    assert [len(s) for s in grid.segments] == [100, 2000]
    assert grid.segments[1].start == frame["start_local"][3000]


def test_autumn_change_repeats_the_hour_in_a_second_segment() -> None:
    # 25 October 2026: 02:00 WEST becomes 01:00 WET, at 01:00 UTC.
    grid = regular(record(datetime(2026, 10, 25), 12), MEAN)
    first, second = grid.segments
    assert (first.start, first.end) == (datetime(2026, 10, 25, 1), datetime(2026, 10, 25, 2))
    assert second.start == datetime(2026, 10, 25, 1)
    np.testing.assert_array_equal(second.values["p_kw"], np.arange(4, 12, dtype=np.float32))


def test_spring_change_leaves_the_skipped_hour_empty() -> None:
    # 29 March 2026: 01:00 WET becomes 02:00 WEST, at 01:00 UTC.
    grid = regular(record(datetime(2026, 3, 29), 12), MEAN)
    first, second = grid.segments
    assert first.end == datetime(2026, 3, 29, 1)
    assert second.start == datetime(2026, 3, 29, 2)


def test_change_of_interval_starts_a_segment() -> None:
    quarters = record(datetime(2026, 1, 5), 8)
    halves = record(datetime(2026, 1, 5, 2), 4, minutes=30)
    grid = regular(pl.concat([quarters, halves]), MEAN)
    assert [s.step_ms for s in grid.segments] == [900_000, 1_800_000]
    assert [len(s) for s in grid.segments] == [8, 4]


def test_shifted_stamps_start_a_segment_and_a_wandering_clock_does_not_make_hundreds() -> None:
    frame = record(datetime(2026, 1, 5), 400)
    late = frame[200:].with_columns(
        pl.col("start_utc") + timedelta(minutes=7), pl.col("start_local") + timedelta(minutes=7)
    )
    shifted = regular(pl.concat([frame[:200], late]), MEAN)
    assert len(shifted.segments) == 2
    assert shifted.segments[1].start == datetime(2026, 1, 7, 2, 7)
    jitter = pl.Series([timedelta(seconds=n % 2 * 20) for n in range(400)])
    wandering = frame.with_columns(pl.col("start_utc") + jitter, pl.col("start_local") + jitter)
    grid = regular(wandering, MEAN)
    assert len(grid.segments) == 1
    np.testing.assert_array_equal(grid.column("p_kw"), np.arange(400, dtype=np.float32))


def test_coarser_grid_starts_on_the_round_clock_and_joins_by_kind() -> None:
    frame = record(datetime(2026, 1, 5, 0, 7), 240, minutes=1).with_columns(
        i_a=pl.col("p_kw") * 2, v_a=230 - 5 * pl.col("p_kw").mod(15).eq(3).cast(pl.Float64)
    )
    joins = MEAN | {"i_a": Join("max"), "v_a": Join("farthest", 230), "r_delta_ohm": Join("median")}
    grid = regular(frame, joins, most_points=60)
    (segment,) = grid.segments
    assert grid.point_min == 5
    assert segment.start == datetime(2026, 1, 5, 0, 5)
    assert segment.values["p_kw"][0] == pytest.approx(1.0)  # minutes 7, 8, 9
    assert segment.values["i_a"][1] == 14  # minutes 10 to 14
    assert segment.values["v_a"].min() == 225
    assert np.isnan(segment.values["r_delta_ohm"]).all()


def test_short_record_is_never_thinned_and_long_one_stays_under_the_most() -> None:
    frame = record(datetime(2026, 1, 5), 5000, minutes=1)
    assert regular(frame, MEAN, most_points=5000).point_min == 0
    for most in (4999, 700, 90):
        grid = regular(frame, MEAN, most_points=most)
        assert sum(len(s) for s in grid.segments) <= most + len(grid.segments)


def test_empty_and_lacking_columns_give_no_numbers() -> None:
    frame = record(datetime(2026, 1, 5), 4)
    assert regular(frame[:0], MEAN).segments == ()
    grid = regular(frame, {"vuf": Join("max")})
    assert not grid.has("vuf")
    assert line_traces(grid, "vuf", "x", hover="", line={"color": "@a"}) == []


def test_not_finite_values_are_gaps() -> None:
    frame = record(datetime(2026, 1, 5), 4).with_columns(
        p_kw=pl.Series([1.0, float("inf"), float("nan"), None])
    )
    values = regular(frame, MEAN).column("p_kw")
    assert np.isfinite(values).tolist() == [True, False, False, False]


def test_traces_share_one_legend_entry_and_carry_start_and_step() -> None:
    grid = regular(record(datetime(2026, 10, 25), 12), MEAN)
    traces = line_traces(grid, "p_kw", "P", hover="%{y}", line={"color": "@p"})
    assert [t["showlegend"] for t in traces] == [True, False]
    assert {t["legendgroup"] for t in traces} == {"P"}
    assert traces[0]["x0"] == datetime(2026, 10, 25, 1, tzinfo=ZoneInfo("UTC")).timestamp() * 1000
    assert traces[0]["dx"] == 900_000
    np.testing.assert_array_equal(unpack(traces[1]["y"]), np.arange(4, 12))


def test_lone_point_is_marked() -> None:
    frame = record(datetime(2026, 1, 5), 5).with_columns(
        p_kw=pl.Series([1.0, None, 7.0, None, 2.0])
    )
    traces = line_traces(regular(frame, MEAN), "p_kw", "P", hover="", line={"color": "@p"})
    dots = [t for t in traces if t["mode"] == "markers"]
    assert unpack(dots[0]["y"]).tolist() == [1, 7, 2]
    assert np.diff(unpack(dots[0]["x"])).tolist() == [1_800_000, 1_800_000]


def test_packing_keeps_nan() -> None:
    assert np.isnan(unpack(pack(np.array([1.5, np.nan])))[1])
    assert unpack(pack(np.array([1.7e12]), "f8"))[0] == 1.7e12


@pytest.mark.parametrize(("count", "per_day"), [(35_040, 96), (525_600, 1440), (8_001, 24)])
def test_stride_visits_every_hour(count: int, per_day: int) -> None:
    step = stride(count, 8_000, per_day)
    rows = np.arange(0, count, step)
    assert len(rows) <= 8_000
    assert len(set((rows % per_day * 24 // per_day).tolist())) == 24


def test_power_factor_of_a_coarse_point_comes_from_sums() -> None:
    count = 60_000
    lead = np.arange(count) % 2 == 0
    frame = record(datetime(2026, 1, 5), count, minutes=1).with_columns(
        p_kw=pl.lit(80.0), q_kvar=pl.Series(np.where(lead, -60.0, 60.0)), pf_vector=pl.lit(0.8)
    )
    service = ServiceFacts("x", "X", "wye-4w", "Europe/Lisbon")
    laid = lay_out(service, frame)
    assert laid.grid.point_min == 2
    # The kvar cancel: unity, where an average of power factors would say 0.8.
    np.testing.assert_allclose(laid.pf[0], 1.0)


def test_days_of_a_clock_change_count_by_their_true_length() -> None:
    service = ServiceFacts("x", "X", "wye-4w", "Europe/Lisbon")
    frame = record(datetime(2026, 10, 23, 23), 4 * 73)  # local days of 24, 25 and 24 hours
    shares = day_shares(service, frame)
    assert list(shares.values()) == [1.0, 1.0, 1.0]
    holes = frame.with_columns(
        p_kw=pl.when(pl.int_range(pl.len()) == 100).then(None).otherwise("p_kw")
    )
    assert day_shares(service, holes)[datetime(2026, 10, 25).date()] == pytest.approx(0.99)
