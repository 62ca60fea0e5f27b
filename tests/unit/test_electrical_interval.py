"""What a phase's quantities come from: metered values first, then V·I·PF."""

from __future__ import annotations

import math

import numpy as np
import pytest
from one_interval import FLOOR_A, NAN, Q_AT_09, I, S, V, flat, interval, words

from meterlens.electrical.conventions import Flag, PowerFactorSense
from meterlens.electrical.interval import IntervalReadings, ServiceConstants, derive_intervals


def test_voltage_current_and_power_factor() -> None:
    out = interval(v=V, i=I, pf=[0.9, 0.9, 0.9])
    assert flat(out.p) == pytest.approx([0.9 * S] * 3)
    assert flat(out.q) == pytest.approx([Q_AT_09] * 3)
    assert flat(out.s) == [S] * 3
    assert flat(out.pf) == pytest.approx([0.9] * 3)
    assert out.p_total[0] == pytest.approx(2.7 * S)
    assert words(out) == Flag.LEAD_LAG_ASSUMED
    assert (out.voltage_angle_grade, out.current_angle_grade) == ("nominal", "per-phase")


def test_leading_has_negative_kvar_and_reactance() -> None:
    out = interval(v=V, i=I, pf=[0.9, 0.9, 0.9], assumed=-1)
    assert flat(out.q) == pytest.approx([-Q_AT_09] * 3)
    assert np.all(out.x_wye < 0)
    assert out.x_delta[0] < 0


def test_power_factor_zero() -> None:
    out = interval("sign-is-lead-lag", v=V, i=I, pf=[-0.0, 0.0, -0.0])
    assert flat(out.p) == [0.0, 0.0, 0.0]
    assert flat(out.q) == [S, -S, S]
    assert flat(out.r_wye) == [0.0, 0.0, 0.0]
    assert flat(out.x_wye) == pytest.approx([2.3, -2.3, 2.3])


def test_unity_needs_no_sense() -> None:
    out = interval(v=V, i=I, pf=[1.0, 1.0, 1.003], assumed=0)
    assert flat(out.q) == [0.0, 0.0, 0.0]
    assert flat(out.p) == [S, S, S]
    assert words(out) == Flag.PF_CLAMPED


def test_no_sense_leaves_kvar_unknown() -> None:
    out = interval(v=V, i=I, pf=[0.9, 0.9, 0.9], assumed=0)
    assert np.isnan(out.q).all()
    assert np.isnan([out.q_total[0], out.s_vector[0], out.pf_vector[0], out.i_neutral[0]]).all()
    assert out.p_total[0] == pytest.approx(2.7 * S)
    assert out.pf_arithmetic[0] == pytest.approx(0.9)
    assert out.current_unbalance[0] == 0.0
    assert words(out) == Flag.Q_UNKNOWN


def test_export_of_one_phase_without_its_sense() -> None:
    out = interval("sign-is-power-flow", v=V, i=I, pf=[-0.9, 0.9, 0.9])
    assert flat(out.p) == pytest.approx([-0.9 * S, 0.9 * S, 0.9 * S])
    assert np.isnan(out.q[0, 0])
    assert flat(out.q[1:]) == pytest.approx([Q_AT_09] * 2)
    assert out.p_total[0] == pytest.approx(0.9 * S)
    assert np.isnan(out.q_total[0])
    assert np.isnan(out.r_wye[0, 0])
    assert out.pf[0, 0] == pytest.approx(-0.9)
    assert words(out) == Flag.LEAD_LAG_ASSUMED | Flag.Q_UNKNOWN


@pytest.mark.parametrize(("word", "kvar"), [(1.0, -Q_AT_09), (-1.0, Q_AT_09)])
def test_export_with_its_sense_follows_the_product(word: float, kvar: float) -> None:
    # Lagging export is quadrant III: P < 0 and Q < 0.
    out = interval("sign-is-power-flow", v=V, i=I, pf=[-0.9] * 3, lead_lag=[word] * 3)
    assert flat(out.q) == pytest.approx([kvar] * 3)
    assert words(out) == Flag(0)


def test_a_negative_number_in_an_unsigned_column() -> None:
    out = interval(v=V, i=I, pf=[-0.9, 0.9, 0.9])
    assert flat(out.p) == pytest.approx([0.9 * S] * 3)
    assert Flag.SIGN_UNEXPECTED in words(out)


def test_metered_kw_and_kvar_win() -> None:
    out = interval(v=V, i=I, pf=[0.9] * 3, p=[20_600.0] * 3, q=[-3_000.0] * 3)
    assert flat(out.p) == [20_600.0] * 3
    assert flat(out.q) == [-3_000.0] * 3
    assert flat(out.s) == [S] * 3  # stays V·I
    assert words(out) == Flag(0)  # the kvar column settled the sense


def test_kvar_from_metered_kw_and_the_tangent() -> None:
    out = interval(v=V, i=I, pf=[0.9] * 3, p=[20_600.0] * 3)
    assert flat(out.q) == pytest.approx([20_600.0 * math.tan(math.acos(0.9))] * 3)
    assert words(out) == Flag.LEAD_LAG_ASSUMED


def test_metered_kw_at_power_factor_zero_takes_kvar_from_volt_amperes() -> None:
    out = interval(v=V, i=I, pf=[0.0] * 3, p=[10.0] * 3)
    assert flat(out.q) == [S] * 3


def test_kvar_from_kva_and_its_assumed_sign() -> None:
    for assumed in (1, -1):
        out = interval("from-power", assumed, p=[12_000.0] * 3, s=[20_000.0] * 3)
        assert flat(out.q) == pytest.approx([assumed * 16_000.0] * 3)
        assert flat(out.s) == [20_000.0] * 3
        assert words(out) == Flag.LEAD_LAG_ASSUMED
    exporting = interval("from-power", 1, p=[-12_000.0] * 3, s=[20_000.0] * 3)
    assert np.isnan(exporting.q).all()
    assert Flag.Q_UNKNOWN in words(exporting)
    unstated = interval("from-power", 0, p=[12_000.0] * 3, s=[20_000.0] * 3)
    assert np.isnan(unstated.q).all()


def test_kw_above_kva_is_rounding() -> None:
    out = interval("from-power", 1, p=[20_010.0] * 3, s=[20_000.0] * 3)
    assert flat(out.q) == [0.0] * 3
    assert flat(out.pf) == [1.0] * 3


def test_metered_kva_does_not_replace_volts_times_amperes() -> None:
    out = interval("from-power", 1, v=V, i=I, p=[12_000.0] * 3, s=[20_000.0] * 3)
    assert flat(out.s) == [S] * 3
    assert flat(out.q) == pytest.approx([16_000.0] * 3)  # from the meter's own pair


@pytest.mark.parametrize(("p", "differs"), [(20_700.0, False), (21_150.0, False), (21_170.0, True)])
def test_power_mismatch(p: float, differs: bool) -> None:
    # V·I·PF is 20.7 kW; the allowance is 2 % of 23 kVA.
    out = interval(v=V, i=I, pf=[0.9] * 3, p=[p, 20_700.0, 20_700.0])
    assert (Flag.POWER_MISMATCH in words(out)) is differs


@pytest.mark.parametrize(("excess", "known"), [(1.004, True), (1.006, False)])
def test_kw_that_exceeds_volt_amperes(excess: float, known: bool) -> None:
    out = interval("from-power", v=V, i=I, p=[excess * S] * 3, q=[0.0] * 3)
    assert flat(out.p) == pytest.approx([excess * S] * 3)
    assert bool(np.isfinite(out.pf).all()) is known
    assert bool(np.isfinite(out.pf_arithmetic).all()) is known
    if known:
        assert flat(out.pf) == [1.0] * 3


@pytest.mark.parametrize("sequence", ["abc", "acb"])
def test_a_balanced_service_of_either_sequence_is_balanced(sequence: str) -> None:
    out = interval(v=V, i=I, pf=[0.8] * 3, sequence=sequence)
    for name in ("vuf", "lvur", "pvur", "iuf2", "iuf0", "current_unbalance"):
        assert getattr(out, name)[0] == pytest.approx(0.0, abs=1e-15), name
    assert out.r_delta[0] == pytest.approx(3 * 2.3 * 0.8)
    assert out.x_delta[0] == pytest.approx(3 * 2.3 * 0.6)
    assert out.s_effective[0] == pytest.approx(3 * S)


def test_metered_line_voltages_settle_the_imbalance() -> None:
    out = interval(v=[250.0, 230.0, 210.0], i=I, pf=[0.9] * 3, v_line=[400.0, 400.0, 400.0])
    assert flat(out.vuf) == [0.0]
    assert flat(out.lvur) == [0.0]
    assert out.pvur[0] == pytest.approx(20.0 / 230.0)


def test_a_loaded_phase_without_power_spoils_the_total() -> None:
    out = interval(v=V, i=I, pf=[NAN, 0.9, 0.9])
    assert np.isnan(out.p_total).all()
    assert Flag.INCOMPLETE in words(out)
    assert out.s_arithmetic[0] == 3 * S


def test_an_idle_phase_without_power_factor_spoils_nothing() -> None:
    out = interval(v=V, i=[15.9, 100.0, 100.0], pf=[NAN, 0.9, 0.9])
    assert out.p[0, 0] == 0.0
    assert out.p_total[0] == pytest.approx(1.8 * S)
    assert np.isnan(out.pf[0, 0])
    assert Flag.NO_LOAD in words(out)
    assert Flag.LIGHT_LOAD not in words(out)


def test_the_floor_itself_is_load() -> None:
    assert Flag.LIGHT_LOAD not in words(interval(v=V, i=[FLOOR_A, 0.0, 0.0], pf=[0.9] * 3))
    light = interval(v=V, i=[math.nextafter(FLOOR_A, 0.0), 0.0, 0.0], pf=[0.9] * 3)
    assert Flag.LIGHT_LOAD in words(light)
    assert light.p[0, 0] == pytest.approx(0.9 * 230.0 * FLOOR_A)
    assert np.isnan([light.pf[0, 0], light.pf_vector[0], light.current_unbalance[0]]).all()


def test_number_of_intervals() -> None:
    assert IntervalReadings(v=np.ones((3, 5))).count == 5
    assert IntervalReadings(p_total=np.ones(7)).count == 7
    empty = derive_intervals(
        IntervalReadings(v=np.ones((3, 0)), i=np.ones((3, 0)), pf=np.ones((3, 0))),
        ServiceConstants("abc", 400.0, 1.0, PowerFactorSense("unsigned", 1)),
    )
    assert empty.p_total.shape == (0,)
    assert empty.p.shape == (3, 0)


def test_an_unknown_sequence_is_refused() -> None:
    with pytest.raises(ValueError, match="phase sequence"):
        interval(v=V, i=I, pf=[0.9] * 3, sequence="bac")
