"""Laws of scale: what doubles when voltage or current does, and what stays."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from kernel_cases import EVERY, SERVICE, anything, close, consuming, derive, identical

from meterlens.electrical.interval import IntervalReadings

# Quantity → powers of the voltage's and of the current's factor; the rest do not change.
POWERS = dict.fromkeys(
    ("p", "q", "s", "p_total", "q_total", "s_vector", "s_arithmetic", "s_effective"), (1, 1)
)
IMPEDANCES = dict.fromkeys(("r_wye", "x_wye", "r_delta", "x_delta"), (1, -1))
EXPONENTS = POWERS | IMPEDANCES | {"i_neutral": (0, 1)}


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
def test_any_factor_scales_loaded_intervals(
    readings: IntervalReadings, k: float, m: float
) -> None:
    assert readings.v is not None
    assert readings.i is not None
    scaled = derive(
        replace(readings, v=readings.v * k, i=readings.i * m), replace(SERVICE, floor_a=0.1)
    )
    plain = derive(readings, replace(SERVICE, floor_a=0.1))
    bulk = {"i_neutral": plain.s_arithmetic * 0 + readings.i.sum(axis=0)}
    for name in EVERY:
        of_v, of_i = EXPONENTS.get(name, (0, 0))
        factor = k**of_v * m**of_i
        first = getattr(plain, name) * factor
        scale = {
            "p": plain.s, "q": plain.s, "p_total": plain.s_arithmetic,
            "q_total": plain.s_arithmetic, "r_wye": np.hypot(plain.r_wye, plain.x_wye),
            "x_wye": np.hypot(plain.r_wye, plain.x_wye),
            "r_delta": np.hypot(plain.r_delta, plain.x_delta),
            "x_delta": np.hypot(plain.r_delta, plain.x_delta),
        }.get(name, bulk.get(name, np.abs(getattr(plain, name)) + (factor == 1.0) * 1.0))
        close(first, getattr(scaled, name), scale * factor + 1e-300, name)
