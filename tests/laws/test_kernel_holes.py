"""Laws of what is not known: batches, holes, the light-load floor, intervals without load."""

from __future__ import annotations

import itertools
from dataclasses import fields, replace

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from kernel_cases import EVERY, FLOOR_A, SERVICE, anything, cut, derive, identical

from meterlens.electrical.conventions import Flag
from meterlens.electrical.interval import IntervalReadings


def flagged(flags: np.ndarray, flag: Flag) -> np.ndarray:
    return np.asarray((flags & np.uint16(flag)) != 0)


@given(anything(most=24), st.lists(st.integers(0, 24), max_size=4))
def test_a_record_may_be_cut_into_batches_anywhere(
    readings: IntervalReadings, cuts: list[int]
) -> None:
    whole = derive(readings)
    n = readings.count
    edges = sorted({0, n, *(c for c in cuts if c < n)})
    parts = [derive(cut(readings, slice(first, last))) for first, last in itertools.pairwise(edges)]
    for name in EVERY:
        joined = np.concatenate([getattr(part, name) for part in parts], axis=-1)
        identical(getattr(whole, name), joined, name)
    np.testing.assert_array_equal(whole.flags, np.concatenate([part.flags for part in parts]))


def test_long_records_may_be_cut_too() -> None:
    rng = np.random.default_rng(20260301)
    n = 5003
    pf = rng.uniform(-1, 1, (3, n))
    pf[rng.random((3, n)) < 0.1] = np.nan
    readings = IntervalReadings(
        v=rng.uniform(200, 260, (3, n)), i=rng.uniform(0, 80, (3, n)), pf=pf
    )
    whole = derive(readings)
    parts = [derive(cut(readings, slice(k, k + 997))) for k in range(0, n, 997)]
    for name in EVERY:
        joined = np.concatenate([getattr(part, name) for part in parts], axis=-1)
        identical(getattr(whole, name), joined, name)


@given(anything(), st.sampled_from(["v", "i", "pf"]), st.integers(0, 2), st.integers(0, 5))
def test_a_hole_stays_in_its_interval(
    readings: IntervalReadings, column: str, phase: int, at: int
) -> None:
    at %= readings.count
    holed = getattr(readings, column).copy()
    holed[phase, at] = np.nan
    before, after = derive(readings), derive(replace(readings, **{column: holed}))
    others = [k for k in range(readings.count) if k != at]
    for name in EVERY:
        identical(getattr(before, name)[..., others], getattr(after, name)[..., others], name)
    np.testing.assert_array_equal(before.flags[others], after.flags[others])


@given(anything())
def test_readings_are_left_as_they_were(readings: IntervalReadings) -> None:
    kept = {
        f.name: getattr(readings, f.name).copy()
        for f in fields(readings)
        if getattr(readings, f.name) is not None
    }
    derive(readings)
    for name, before in kept.items():
        identical(before, getattr(readings, name), name)


@given(anything(), st.floats(0.0, 600.0))
def test_the_floor_blanks_ratios_and_keeps_power(readings: IntervalReadings, floor: float) -> None:
    assert readings.i is not None
    assert readings.pf is not None
    assert readings.v is not None
    assert readings.lead_lag is not None
    # Only with every power known: a blank PF under the floor is another rule.
    readings = replace(
        readings,
        v=np.nan_to_num(readings.v, nan=230.0),
        pf=np.nan_to_num(readings.pf, nan=0.5),
        lead_lag=np.nan_to_num(readings.lead_lag, nan=1.0),
    )
    without = derive(readings, replace(SERVICE, floor_a=0.0))
    under = derive(readings, replace(SERVICE, floor_a=floor))
    known = ~np.isnan(without.p)
    for name in ("p", "q", "s"):
        sound = known & ~np.isnan(getattr(without, name))
        identical(getattr(without, name)[sound], getattr(under, name)[sound], name)
    below = readings.i < floor
    for name in ("pf", "r_wye", "x_wye"):
        assert np.isnan(getattr(under, name)[below]).all(), name
        identical(getattr(without, name)[~below], getattr(under, name)[~below], name)
    light = flagged(under.flags, Flag.LIGHT_LOAD)
    for name in ("current_unbalance", "iuf2", "iuf0", "pf_vector", "r_delta", "x_delta"):
        assert np.isnan(getattr(under, name)[light]).all(), name
        identical(getattr(without, name)[~light], getattr(under, name)[~light], name)


@given(anything())
def test_a_power_factor_not_printed_under_the_floor_is_no_load(readings: IntervalReadings) -> None:
    assert readings.i is not None
    assert readings.pf is not None
    out = derive(readings)
    quiet = np.isnan(readings.pf) & (readings.i < FLOOR_A)
    assert np.all(out.p[quiet] == 0.0)
    assert np.all(out.q[quiet] == 0.0)
    assert np.all(flagged(out.flags, Flag.NO_LOAD)[quiet.any(axis=0)])
    hole = np.isnan(readings.pf) & ~(readings.i < FLOOR_A)
    assert np.isnan(out.p[hole]).all()
    assert np.isnan(out.p_total[hole.any(axis=0)]).all()


@given(anything())
def test_infinity_never_leaves_the_kernel(readings: IntervalReadings) -> None:
    out = derive(readings)
    for name in EVERY:
        assert not np.isinf(getattr(out, name)).any(), name
