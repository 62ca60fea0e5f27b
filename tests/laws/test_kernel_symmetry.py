"""The phases have names, not ranks: renaming them changes no total and no imbalance."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from kernel_cases import (
    IMBALANCE,
    MIRRORED,
    PER_PHASE,
    PF_TOTALS,
    SERVICE,
    TOTALS,
    anything,
    close,
    consuming,
    derive,
    identical,
    permuted,
)

from meterlens.electrical.interval import (
    IntervalQuantities,
    IntervalReadings,
    ServiceConstants,
)


def alike(
    readings: IntervalReadings, order: list[int], first: ServiceConstants, second: ServiceConstants
) -> None:
    plain, turned = derive(readings, first), derive(permuted(readings, order), second)
    for name in PER_PHASE:
        identical(getattr(plain, name)[order], getattr(turned, name), name)
    _totals_alike(plain, turned, readings)


def _totals_alike(
    plain: IntervalQuantities, turned: IntervalQuantities, readings: IntervalReadings
) -> None:
    assert readings.i is not None
    for name in TOTALS:
        close(getattr(plain, name), getattr(turned, name), plain.s_arithmetic, name)
    for name in (*PF_TOTALS, *IMBALANCE):
        close(getattr(plain, name), getattr(turned, name), 10.0, name)
    ohms = np.hypot(plain.r_delta, plain.x_delta)
    close(plain.r_delta, turned.r_delta, 10.0 * ohms, "r_delta")
    close(plain.x_delta, turned.x_delta, 10.0 * ohms, "x_delta")
    close(plain.i_neutral, turned.i_neutral, readings.i.sum(axis=0), "i_neutral")
    np.testing.assert_array_equal(plain.flags, turned.flags)


@pytest.mark.parametrize("order", [[1, 2, 0], [2, 0, 1]])
@pytest.mark.parametrize("service", [SERVICE, MIRRORED], ids=["abc", "acb"])
@given(readings=consuming())
def test_rolling_the_phases_changes_nothing(
    readings: IntervalReadings, service: ServiceConstants, order: list[int]
) -> None:
    alike(readings, order, service, service)


@pytest.mark.parametrize("order", [[0, 2, 1], [2, 1, 0], [1, 0, 2]])
@given(readings=consuming())
def test_two_phases_swapped_with_the_sequence_change_nothing(
    readings: IntervalReadings, order: list[int]
) -> None:
    alike(readings, order, SERVICE, MIRRORED)


@given(readings=consuming())
def test_two_phases_swapped_without_the_sequence_keep_powers(readings: IntervalReadings) -> None:
    # P and Q of a phase do not know the sequence; what needs phasors does.
    plain, turned = derive(readings), derive(readings, MIRRORED)
    for name in (*PER_PHASE, "p_total", "q_total", "s_vector", "s_arithmetic", "lvur", "vuf"):
        close(getattr(plain, name), getattr(turned, name), 1e3 * plain.s_arithmetic, name)


@pytest.mark.parametrize("order", [[1, 2, 0], [0, 2, 1]])
@given(readings=anything())
def test_holes_and_idle_phases_follow_their_phase(
    readings: IntervalReadings, order: list[int]
) -> None:
    plain = derive(readings)
    turned = derive(permuted(readings, order), SERVICE if order == [1, 2, 0] else MIRRORED)
    for name in PER_PHASE:
        identical(getattr(plain, name)[order], getattr(turned, name), name)
    for name in ("p_total", "q_total", "s_arithmetic"):
        same = np.isnan(getattr(plain, name)) == np.isnan(getattr(turned, name))
        assert same.all(), name
    np.testing.assert_array_equal(plain.flags, turned.flags)
