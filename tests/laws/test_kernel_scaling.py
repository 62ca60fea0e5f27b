"""Laws of scale: what doubles when voltage or current does, and what stays."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from kernel_cases import (
    EVERY,
    SERVICE,
    TOTALS,
    Floats,
    anything,
    close,
    consuming,
    derive,
    identical,
)

from meterlens.electrical.interval import IntervalQuantities, IntervalReadings

# Quantity → powers of the voltage's and of the current's factor; the rest do not change.
POWERS = dict.fromkeys(
    ("p", "q", "s", "p_total", "q_total", "s_vector", "s_arithmetic", "s_effective"), (1, 1)
)
IMPEDANCES = dict.fromkeys(("r_wye", "x_wye", "r_delta", "x_delta"), (1, -1))
EXPONENTS = POWERS | IMPEDANCES | {"i_neutral": (0, 1)}


def sizes(plain: IntervalQuantities, readings: IntervalReadings) -> dict[str, Floats]:
    """What each quantity was subtracted from: the measure of its rounding."""
    assert readings.i is not None
    one = np.ones(readings.count)
    found = dict.fromkeys(EVERY, one)
    found |= dict.fromkeys(("p", "q", "s"), plain.s)
    found |= dict.fromkeys(TOTALS, plain.s_arithmetic)
    found |= dict.fromkeys(("r_wye", "x_wye"), np.hypot(plain.r_wye, plain.x_wye))
    found |= dict.fromkeys(("r_delta", "x_delta"), 10.0 * np.hypot(plain.r_delta, plain.x_delta))
    found |= dict.fromkeys(("iuf2", "iuf0"), 10.0 * one)
    return found | {"i_neutral": readings.i.sum(axis=0)}


@given(anything(), st.integers(-6, 6), st.integers(-6, 6))
def test_powers_of_two_scale_every_quantity_to_the_bit(
    readings: IntervalReadings, volts: int, amperes: int
) -> None:
    k, m = 2.0**volts, 2.0**amperes
    assert readings.v is not None
    assert readings.i is not None
    scaled = derive(
        replace(readings, v=readings.v * k, i=readings.i * m),
        replace(SERVICE, floor_a=SERVICE.floor_a * m),
    )
    plain = derive(readings)
    for name in EVERY:
        of_v, of_i = EXPONENTS.get(name, (0, 0))
        identical(getattr(plain, name) * k**of_v * m**of_i, getattr(scaled, name), name)
    np.testing.assert_array_equal(plain.flags, scaled.flags)


@given(consuming(), st.floats(0.25, 4.0), st.floats(0.25, 4.0))
def test_any_factor_scales_loaded_intervals(readings: IntervalReadings, k: float, m: float) -> None:
    assert readings.v is not None
    assert readings.i is not None
    scaled = derive(
        replace(readings, v=readings.v * k, i=readings.i * m), replace(SERVICE, floor_a=0.1)
    )
    plain = derive(readings, replace(SERVICE, floor_a=0.1))
    scales = sizes(plain, readings)
    for name in EVERY:
        of_v, of_i = EXPONENTS.get(name, (0, 0))
        factor = k**of_v * m**of_i
        close(getattr(plain, name) * factor, getattr(scaled, name), scales[name] * factor, name)
