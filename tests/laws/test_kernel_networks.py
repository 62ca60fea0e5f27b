"""Laws of impedances and of symmetrical components."""

from __future__ import annotations

import cmath

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp
from kernel_cases import Floats, consuming, derive, matrix

from meterlens.electrical import balance, impedance, phasors
from meterlens.electrical.conventions import phase_rotation
from meterlens.electrical.interval import IntervalReadings

TURN = cmath.exp(2j * cmath.pi / 3)
PASSIVE = st.builds(lambda r, x: r + 1j * x, matrix(4, 0.1, 20.0), matrix(4, -20.0, 20.0))
PHASORS = st.builds(lambda x, y: x + 1j * y, matrix(4, -300.0, 300.0), matrix(4, -300.0, 300.0))


@given(PASSIVE)
def test_delta_and_wye_undo_each_other(z: np.ndarray) -> None:
    back = impedance.wye_from_delta(impedance.delta_from_wye(z))
    assert np.all(np.abs(back - z) <= 1e-9 * np.abs(z).max(axis=0))


@given(PASSIVE)
def test_delta_and_wye_are_alike_between_every_two_terminals(wye: np.ndarray) -> None:
    delta = impedance.delta_from_wye(wye)
    for k in range(3):
        direct, around = delta[k], delta[(k + 1) % 3] + delta[(k + 2) % 3]
        between = wye[k] + wye[(k + 1) % 3]  # the third terminal left open
        scale = np.abs(wye).sum(axis=0) ** 2
        assert np.all(
            np.abs(direct * around - between * (direct + around))
            <= 1e-9 * (scale + np.abs(direct * around))
        )


@given(
    hnp.arrays(np.complex128, 4, elements=st.complex_numbers(min_magnitude=1e-3, max_magnitude=1e3))
)
def test_equal_elements_are_three_times_larger_in_delta(z: np.ndarray) -> None:
    same = np.repeat(z[None, :], 3, axis=0)
    np.testing.assert_allclose(impedance.delta_from_wye(same), 3 * same, rtol=1e-12)
    np.testing.assert_allclose(impedance.wye_from_delta(3 * same), same, rtol=1e-12)


def test_an_open_phase_leaves_the_other_two_in_series() -> None:
    z_b, z_c = 3 + 1j, 2 - 4j
    delta = impedance.delta_from_wye(np.array([complex(np.inf, 0.0), z_b, z_c]))
    assert cmath.isclose(delta[1], z_b + z_c, rel_tol=1e-14)
    assert not np.isfinite(delta[[0, 2]]).any()


@given(consuming())
def test_the_balanced_delta_is_three_times_the_wye_of_a_level_load(
    readings: IntervalReadings,
) -> None:
    level = {
        name: np.repeat(getattr(readings, name)[:1], 3, axis=0)
        for name in ("v", "i", "pf", "lead_lag")
    }
    out = derive(IntervalReadings(**level))
    ohms = np.hypot(out.r_wye[0], out.x_wye[0])
    assert np.all(np.abs(out.r_delta - 3 * out.r_wye[0]) <= 1e-11 * ohms)
    assert np.all(np.abs(out.x_delta - 3 * out.x_wye[0]) <= 1e-11 * ohms)
    assert np.all(out.i_neutral <= 1e-12 * level["i"][0])
    assert np.all(out.vuf <= 1e-12)
    assert np.all(out.iuf2 <= 1e-12)


@given(PHASORS)
def test_sequence_components_add_up_to_the_phases(x: np.ndarray) -> None:
    x_0, x_1, x_2 = phasors.sequence_components(x)
    size = np.abs(x).sum(axis=0) + 1e-12
    for k, phase in enumerate(x):
        # b = X0 + a²X1 + aX2, c = X0 + aX1 + a²X2
        built = x_0 + TURN ** (-k) * x_1 + TURN**k * x_2
        assert np.all(np.abs(built - phase) <= 1e-13 * size)


@given(PHASORS, PHASORS)
def test_power_is_the_same_in_sequence_components(v: np.ndarray, i: np.ndarray) -> None:
    direct = (v * np.conj(i)).sum(axis=0)
    pairs = zip(phasors.sequence_components(v), phasors.sequence_components(i), strict=True)
    by_sequence = sum(3 * x * np.conj(y) for x, y in pairs)
    scale = np.abs(v).sum(axis=0) * np.abs(i).sum(axis=0) + 1e-12
    assert np.all(np.abs(direct - by_sequence) <= 1e-13 * scale)


@given(matrix(3, 1.0, 500.0))
def test_a_rotation_has_one_sequence_only(x: Floats) -> None:
    level = np.repeat(x[:1], 3, axis=0)
    for sequence, lone in (("abc", 1), ("acb", 2)):
        parts = phasors.sequence_components(phasors.nominal_voltage_phasors(level, sequence))
        for k, part in enumerate(parts):
            expected = x[0] if k == lone else 0.0
            assert np.all(np.abs(np.abs(part) - expected) <= 1e-14 * x[0])
        assert np.all(phase_rotation(sequence).sum() == 0.0)


@given(PHASORS)
def test_line_voltages_do_not_see_the_zero_sequence(v: np.ndarray) -> None:
    plain = phasors.line_voltages(v)
    for k in range(3):
        expected = [abs(complex(p) - complex(q)) for p, q in zip(v[k], v[(k + 1) % 3], strict=True)]
        np.testing.assert_allclose(plain[k], expected, rtol=1e-13)
    shifted = phasors.line_voltages(v + (17.0 - 9.0j))
    assert np.all(np.abs(shifted - plain) <= 1e-12 * (np.abs(v).sum(axis=0) + 20.0))


@given(matrix(4, 0.0, 500.0), st.floats(0.5, 2.0))
def test_deviation_from_mean(x: Floats, k: float) -> None:
    value = balance.deviation_from_mean(x)
    zero = ~(x.sum(axis=0) > 0)
    np.testing.assert_array_equal(np.isnan(value), zero)
    known = ~zero
    assert np.all((value[known] >= 0) & (value[known] <= 2.0 + 1e-12))
    np.testing.assert_allclose(balance.deviation_from_mean(x * k)[known], value[known], atol=1e-12)
