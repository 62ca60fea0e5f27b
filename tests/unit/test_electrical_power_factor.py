"""Printed power factors at the edges of each convention."""

from __future__ import annotations

import numpy as np
import pytest

from meterlens.electrical.conventions import (
    PF_CLAMP_BOUND,
    Flag,
    PowerFactorReading,
    PowerFactorSense,
    phase_rotation,
    read_power_factor,
)

NAN = np.nan


def read(
    *printed: float,
    convention: str = "unsigned",
    assumed: int = 1,
    lagging_sign: int = -1,
    per_unit: float = 1.0,
    p: list[float] | None = None,
    lead_lag: list[float] | None = None,
) -> PowerFactorReading:
    """One interval, three phases."""

    def column(x: list[float] | None) -> np.ndarray | None:
        return None if x is None else np.array(x, dtype=float)[:, None]

    rule = PowerFactorSense(convention, assumed, lagging_sign, per_unit)
    return read_power_factor(np.array(printed)[:, None], rule, column(p), column(lead_lag))


def words(reading: PowerFactorReading, phase: int = 0) -> Flag:
    """The flags of one phase, with the one that an assumed sense gives to Q ≠ 0."""
    assumes = reading.assumed[phase, 0] and reading.magnitude[phase, 0] < 1.0
    flags = Flag(int(reading.flags[phase, 0]))
    return flags | Flag.LEAD_LAG_ASSUMED if assumes else flags


def test_zero_and_minus_zero() -> None:
    unsigned = read(0.0, -0.0, 0.0)
    assert unsigned.magnitude.ravel().tolist() == [0.0, 0.0, 0.0]
    assert unsigned.direction.ravel().tolist() == [1.0, 1.0, 1.0]
    assert words(unsigned, 1) == Flag.LEAD_LAG_ASSUMED  # "-0.0" is no negative number
    flow = read(0.0, -0.0, -0.5, convention="sign-is-power-flow")
    assert flow.direction.ravel().tolist() == [1.0, 1.0, -1.0]


@pytest.mark.parametrize(("lagging_sign", "expected"), [(-1, [-1, 1, 1]), (1, [1, -1, -1])])
def test_a_pure_reactor_keeps_the_sense_of_its_sign_bit(
    lagging_sign: int, expected: list[int]
) -> None:
    reading = read(0.0, -0.0, -0.85, convention="sign-is-lead-lag", lagging_sign=lagging_sign)
    assert reading.sense.ravel().tolist() == expected
    assert reading.direction.ravel().tolist() == [1.0, 1.0, 1.0]
    assert not reading.flags.any()


@pytest.mark.parametrize(("unity", "printed"), [(1.0, 1.003), (100.0, 100.3)])
def test_a_hair_over_unity_is_clamped_and_flagged(unity: float, printed: float) -> None:
    reading = read(printed, -printed, 0.5 * unity, per_unit=unity)
    assert reading.magnitude.ravel().tolist() == [1.0, 1.0, 0.5]
    assert words(reading) == Flag.PF_CLAMPED
    assert words(reading, 1) == Flag.PF_CLAMPED | Flag.SIGN_UNEXPECTED
    assert words(reading, 2) == Flag.LEAD_LAG_ASSUMED


def test_far_over_unity_is_for_the_caller_to_blank() -> None:
    # Values beyond the bound are nulled where the export is read; what still comes here is
    # clamped and flagged like any other, never passed on as a |PF| above 1.
    assert PF_CLAMP_BOUND == 1.005
    reading = read(1.02, 0.9, 0.9)
    assert reading.magnitude[0, 0] == 1.0
    assert words(reading) == Flag.PF_CLAMPED


def test_unity_assumes_nothing() -> None:
    assert not read(1.0, 1.0, 1.0).flags.any()
    assert words(read(0.99, 1.0, 1.0)) == Flag.LEAD_LAG_ASSUMED


def test_a_negative_number_in_an_unsigned_column_is_flagged() -> None:
    reading = read(-0.9, 0.9, 0.9)
    assert reading.magnitude[0, 0] == 0.9
    assert reading.direction[0, 0] == 1.0
    assert words(reading) == Flag.SIGN_UNEXPECTED | Flag.LEAD_LAG_ASSUMED
    assert Flag.SIGN_UNEXPECTED not in words(reading, 1)


def test_unsigned_export_of_a_power_column() -> None:
    reading = read(0.9, 0.9, 0.9, p=[-5.0, 5.0, NAN])
    assert reading.direction.ravel().tolist() == [-1.0, 1.0, 1.0]
    # The assumption holds at import only.
    assert np.isnan(reading.sense[0, 0])
    assert reading.sense[1:].ravel().tolist() == [1.0, 1.0]


@pytest.mark.parametrize("assumed", [1, -1])
def test_export_by_sign_has_no_assumed_sense(assumed: int) -> None:
    reading = read(-0.9, 0.9, 0.9, convention="sign-is-power-flow", assumed=assumed)
    assert np.isnan(reading.sense[0, 0])
    assert reading.sense[1, 0] == assumed
    assert words(reading) == Flag(0)
    assert words(reading, 1) == Flag.LEAD_LAG_ASSUMED


def test_nothing_assumed_is_nothing_known() -> None:
    reading = read(0.9, 0.8, 1.0, assumed=0)
    assert np.isnan(reading.sense).all()
    assert not reading.flags.any()


def test_a_lead_lag_column_wins_over_the_assumption() -> None:
    reading = read(
        0.9, -0.9, 0.9, convention="sign-is-power-flow", lead_lag=[-1.0, -1.0, NAN], assumed=1
    )
    assert reading.sense.ravel().tolist() == [-1.0, -1.0, 1.0]
    assert [words(reading, k) for k in range(3)] == [Flag(0), Flag(0), Flag.LEAD_LAG_ASSUMED]


def test_not_printed_is_not_known() -> None:
    reading = read(NAN, 0.9, 0.9)
    assert np.isnan(reading.magnitude[0, 0])
    assert words(reading) == Flag(0)


def test_rotation_of_either_sequence() -> None:
    abc, acb = phase_rotation("abc"), phase_rotation("acb")
    assert abc.shape == (3, 1)
    np.testing.assert_allclose(np.degrees(np.angle(abc)).ravel(), [0, -120, 120], atol=1e-12)
    np.testing.assert_array_equal(acb, np.conj(abc))
    for sequence in ("", "ABC", "bca", "cba"):
        with pytest.raises(ValueError, match="neither 'abc' nor 'acb'"):
            phase_rotation(sequence)


def test_flags_fit_their_column() -> None:
    assert all(0 < int(flag) < 2**16 for flag in Flag)
    assert len({int(flag) for flag in Flag}) == len(Flag)
