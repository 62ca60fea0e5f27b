"""Power sent through each way of printing a power factor comes back."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kernel_cases import SERVICE, Floats, derive, matrix

from meterlens.electrical.conventions import Flag, PowerFactorSense
from meterlens.electrical.interval import IntervalQuantities, IntervalReadings

UNITS = pytest.mark.parametrize("unity", [1.0, 100.0], ids=["fraction", "percent"])


def loads(quadrants: tuple[int, ...] = (1, 2, 3, 4)) -> st.SearchStrategy[tuple[Floats, ...]]:
    """V, I and the angle of S in some quadrants, kept off the axes by a thousandth."""

    def turned(v: Floats, i: Floats, share: Floats, quadrant: int) -> tuple[Floats, ...]:
        return v, i, (quadrant - 1 + share) * np.pi / 2

    return st.builds(
        turned,
        matrix(3, 150.0, 300.0),
        matrix(3, 5.0, 500.0),
        matrix(3, 0.001, 0.999),
        st.sampled_from(quadrants),
    )


def comes_back(
    case: tuple[Floats, ...],
    printed: Floats,
    sense: PowerFactorSense,
    **more: Floats | None,
) -> IntervalQuantities:
    v, i, phi = case
    readings = IntervalReadings(v=v, i=i, pf=printed * sense.per_unit, **more)
    out = derive(readings, replace(SERVICE, power_factor=sense))
    s = v * i
    # cos φ printed to the last bit still blurs Q near unity: dQ = dP/tan φ.
    np.testing.assert_allclose(out.p, s * np.cos(phi), rtol=1e-12, atol=0)
    assert np.all(np.abs(out.q - s * np.sin(phi)) <= 1e-11 * s)
    return out


def words(phi: Floats) -> Floats:
    """+1 where P·Q > 0 (the word lagging), else -1."""
    return np.sign(np.cos(phi) * np.sin(phi))


@UNITS
@pytest.mark.parametrize(("assumed", "quadrant"), [(1, 1), (-1, 4)])
@given(drawn=st.data())
def test_unsigned(drawn: st.DataObject, unity: float, assumed: int, quadrant: int) -> None:
    case = drawn.draw(loads((quadrant,)))
    sense = PowerFactorSense("unsigned", assumed, per_unit=unity)
    out = comes_back(case, np.cos(case[2]), sense)
    assert np.all(out.flags & np.uint16(Flag.LEAD_LAG_ASSUMED))


@UNITS
@given(case=loads())
def test_sign_is_power_flow_with_lead_lag(case: tuple[Floats, ...], unity: float) -> None:
    sense = PowerFactorSense("sign-is-power-flow", per_unit=unity)
    out = comes_back(case, np.cos(case[2]), sense, lead_lag=words(case[2]))
    assert not np.any(out.flags & np.uint16(Flag.LEAD_LAG_ASSUMED | Flag.Q_UNKNOWN))


@UNITS
@pytest.mark.parametrize("lagging_sign", [1, -1])
@given(case=loads((1, 4)))
def test_sign_is_lead_lag_at_import(
    case: tuple[Floats, ...], lagging_sign: int, unity: float
) -> None:
    sense = PowerFactorSense("sign-is-lead-lag", lagging_sign=lagging_sign, per_unit=unity)
    comes_back(case, np.abs(np.cos(case[2])) * words(case[2]) * lagging_sign, sense)


@UNITS
@pytest.mark.parametrize("lagging_sign", [1, -1])
@given(case=loads())
def test_sign_is_lead_lag_with_a_power_column(
    case: tuple[Floats, ...], lagging_sign: int, unity: float
) -> None:
    v, i, phi = case
    sense = PowerFactorSense("sign-is-lead-lag", lagging_sign=lagging_sign, per_unit=unity)
    printed = np.abs(np.cos(phi)) * words(phi) * lagging_sign
    out = comes_back(case, printed, sense, p=v * i * np.cos(phi))
    assert not np.any(out.flags & np.uint16(Flag.POWER_MISMATCH))


@given(case=loads())
def test_metered_kw_and_kvar_need_no_power_factor(case: tuple[Floats, ...]) -> None:
    v, i, phi = case
    p, q = v * i * np.cos(phi), v * i * np.sin(phi)
    out = derive(
        IntervalReadings(v=v, i=i, p=p, q=q),
        replace(SERVICE, power_factor=PowerFactorSense("from-power")),
    )
    np.testing.assert_array_equal(out.p, p)
    np.testing.assert_array_equal(out.q, q)
    np.testing.assert_allclose(out.pf, np.cos(phi), rtol=1e-12)


@given(case=loads((1,)))
def test_kw_with_kva(case: tuple[Floats, ...]) -> None:
    v, i, phi = case
    out = derive(
        IntervalReadings(p=v * i * np.cos(phi), s=v * i),
        replace(SERVICE, floor_a=0.0, power_factor=PowerFactorSense("from-power", assumed=1)),
    )
    assert np.all(np.abs(out.q - v * i * np.sin(phi)) <= 1e-11 * v * i)
    np.testing.assert_array_equal(out.s, v * i)


@given(case=loads())
def test_the_wye_impedance_gives_the_power_back(case: tuple[Floats, ...]) -> None:
    v, i, phi = case
    sense = PowerFactorSense("sign-is-power-flow")
    out = comes_back(case, np.cos(phi), sense, lead_lag=words(phi))
    z = out.r_wye + 1j * out.x_wye
    np.testing.assert_allclose(np.abs(z), v / i, rtol=1e-12)
    s = v * v / np.conj(z)  # S = V·I* with I = V/Z
    assert np.all(np.abs(s - (out.p + 1j * out.q)) <= 1e-12 * v * i)
