"""Exports that say less: totals only, one power factor, volts and amperes only."""

from __future__ import annotations

import math

import numpy as np
import pytest
from one_interval import FLOOR_A, I, S, V, flat, interval, words

from meterlens.electrical.conventions import Flag


def test_metered_totals_win() -> None:
    out = interval(v=V, i=I, pf=[0.9] * 3, p_total=62_000.0, q_total=29_000.0)
    assert flat(out.p_total) == [62_000.0]
    assert flat(out.q_total) == [29_000.0]
    assert flat(out.s_vector) == pytest.approx([math.hypot(62_000.0, 29_000.0)])
    assert flat(out.s_arithmetic) == [3 * S]


def test_totals_only() -> None:
    out = interval("from-power", p_total=60_000.0, q_total=-11_000.0)
    assert flat(out.s_vector) == pytest.approx([61_000.0])
    assert flat(out.pf_vector) == pytest.approx([60.0 / 61.0])
    per_phase = (out.p, out.q, out.s, out.r_wye)
    assert all(np.isnan(x).all() for x in per_phase)
    unknown = (out.vuf, out.current_unbalance, out.i_neutral, out.s_arithmetic, out.r_delta)
    assert all(np.isnan(x).all() for x in unknown)
    assert out.current_angle_grade == "shared"
    assert words(out) == Flag(0)


@pytest.mark.parametrize(("share", "light"), [(0.99, True), (1.01, False)])
def test_totals_only_at_the_equivalent_floor(share: float, light: bool) -> None:
    p = share * FLOOR_A * 400.0 * math.sqrt(3.0)
    out = interval("from-power", p_total=p, q_total=0.0)
    assert flat(out.p_total) == [p]
    assert bool(np.isnan(out.pf_vector[0])) is light
    assert words(out) == (Flag.LIGHT_LOAD if light else Flag(0))


def test_totals_of_an_export_have_no_assumed_kvar() -> None:
    out = interval("from-power", 1, p_total=-36e3, s_total=60e3)
    assert flat(out.p_total) == [-36e3]
    assert np.isnan(out.q_total).all()


def test_totals_with_currents_are_shared_by_volt_amperes() -> None:
    out = interval("from-power", v=V, i=[50.0, 100.0, 150.0], p_total=60_000.0, q_total=30_000.0)
    assert flat(out.p) == pytest.approx([10_000.0, 20_000.0, 30_000.0])
    assert flat(out.q) == pytest.approx([5_000.0, 10_000.0, 15_000.0])
    assert out.current_angle_grade == "shared"


def test_one_power_factor_for_all_phases() -> None:
    out = interval(v=V, i=[50.0, 100.0, 150.0], pf_total=0.9)
    apart = interval(v=V, i=[50.0, 100.0, 150.0], pf=[0.9] * 3)
    assert out.current_angle_grade == "shared"
    for name in ("p", "q", "pf", "p_total", "q_total", "i_neutral", "iuf2"):
        np.testing.assert_array_equal(getattr(out, name), getattr(apart, name))


def test_volts_and_amperes_only() -> None:
    i = [100.0, 80.0, 60.0]
    out = interval("none", v=[230.0, 228.0, 226.0], i=i)
    for name in ("p", "q", "pf", "r_wye", "x_wye", "p_total", "q_total", "r_delta"):
        assert np.isnan(getattr(out, name)).all(), name
    assert out.current_angle_grade == "equal"
    # Three currents 120° apart leave √(Σi² − Σ i_j i_k) in the neutral.
    rest = math.sqrt(100**2 + 80**2 + 60**2 - 100 * 80 - 80 * 60 - 60 * 100)
    assert out.i_neutral[0] == pytest.approx(rest)
    assert out.iuf0[0] == pytest.approx(rest / 240.0)
    assert out.iuf2[0] == pytest.approx(rest / 240.0)
    assert out.current_unbalance[0] == pytest.approx(0.25)
    assert out.pvur[0] == pytest.approx(2.0 / 228.0)
    assert out.s_arithmetic[0] == pytest.approx(23_000 + 18_240 + 13_560)
    assert np.isfinite([out.vuf[0], out.lvur[0], out.s_effective[0]]).all()
    assert words(out) == Flag.INCOMPLETE
