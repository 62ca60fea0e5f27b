"""Laws of power: P² + Q² = S², the order of the three apparent powers, conservation."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from kernel_cases import anything, close, consuming, derive, identical

from meterlens.electrical import power
from meterlens.electrical.conventions import Flag
from meterlens.electrical.interval import IntervalReadings

ROUNDING = 1.0 + 1e-12


@given(anything())
def test_active_and_reactive_power_of_a_phase_make_its_apparent_power(
    readings: IntervalReadings,
) -> None:
    out = derive(readings)
    assert readings.v is not None
    assert readings.i is not None
    assert readings.pf is not None
    identical(out.s, readings.v * readings.i, "s")
    made = np.hypot(out.p, out.q)
    printed = ~np.isnan(readings.pf) & ~np.isnan(made) & ~np.isnan(out.s)
    close(made[printed], out.s[printed], out.s[printed], "p, q, s")


@given(anything())
def test_totals_are_sums_of_what_the_phases_carry(readings: IntervalReadings) -> None:
    out = derive(readings)
    assert readings.i is not None
    carries = ~(readings.i < 4.0)
    for part, total in ((out.p, out.p_total), (out.q, out.q_total), (out.s, out.s_arithmetic)):
        lacks = (np.isnan(part) & carries).any(axis=0)
        np.testing.assert_array_equal(np.isnan(total), lacks)
        whole = ~lacks
        close(total[whole], np.nansum(part, axis=0)[whole], np.nansum(out.s, axis=0)[whole] + 1e-9)
    incomplete = (out.flags & np.uint16(Flag.INCOMPLETE)) != 0
    np.testing.assert_array_equal(incomplete, np.isnan(out.p_total))


@given(anything())
def test_vector_apparent_power_is_the_least(readings: IntervalReadings) -> None:
    out = derive(readings)
    for larger in (out.s_arithmetic, out.s_effective):
        both = ~np.isnan(out.s_vector) & ~np.isnan(larger)
        assert np.all(out.s_vector[both] <= larger[both] * ROUNDING)


@given(consuming(level_voltages=True))
def test_arithmetic_is_at_most_effective_on_level_voltages(readings: IntervalReadings) -> None:
    out = derive(readings)
    assert np.all(out.s_arithmetic <= out.s_effective * ROUNDING)
    assert np.all(out.pf_effective <= out.pf_arithmetic * ROUNDING)
    assert np.all(out.pf_arithmetic <= out.pf_vector * ROUNDING)


@given(st.floats(0.0, 1.0), st.floats(1.0, 1e6))
def test_the_three_ways_to_reactive_power_agree(pf: float, s: float) -> None:
    p = np.array([s * pf])
    from_pf = power.reactive_power_from_power_factor(np.array([s]), np.array([pf]))
    # P is rounded, so near unity S² − P² knows Q to √(2 ulp) of S only.
    from_s = power.reactive_power_from_apparent(np.array([s]), p)
    assert abs(from_pf[0] - from_s[0]) <= 3e-8 * s
    if pf > 1e-6:
        from_tangent = p * power.tangent_of_power_factor(np.array([pf]))
        assert abs(from_pf[0] - from_tangent[0]) <= 1e-12 * s


@given(anything())
def test_power_factors_are_power_over_apparent_power(readings: IntervalReadings) -> None:
    out = derive(readings)
    pairs = (
        (out.pf, out.p, out.s),
        (out.pf_vector, out.p_total, out.s_vector),
        (out.pf_arithmetic, out.p_total, out.s_arithmetic),
        (out.pf_effective, out.p_total, out.s_effective),
    )
    for pf, p, s in pairs:
        known = ~np.isnan(pf)
        assert np.all(np.abs(pf[known]) <= 1.0)
        close(pf[known] * s[known], p[known], s[known])
