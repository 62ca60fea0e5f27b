"""|V₂|/|V₁| from line-to-line magnitudes, against geometry and fifty digits."""

from __future__ import annotations

import math

import numpy as np
from hypothesis import assume, given
from hypothesis import strategies as st
from kernel_cases import Floats, matrix
from mpmath import mp, mpc, mpf

from meterlens.electrical.balance import deviation_from_mean, voltage_unbalance_from_lines
from meterlens.electrical.phasors import line_voltages, sequence_components


def one(*sides: float) -> float:
    return float(voltage_unbalance_from_lines(np.array(sides, dtype=float)[:, None])[0])


def by_beta(*sides: float) -> mpf:
    """The standard's form, at fifty digits."""
    with mp.workdps(50):
        d, e, f = (mpf(x) ** 2 for x in sides)
        beta = (d * d + e * e + f * f) / (d + e + f) ** 2
        root = min(mp.sqrt(3 - 6 * beta), mpf(1))
        return mp.sqrt((1 - root) / (1 + root))


def by_geometry(v_ab: float, v_bc: float, v_ca: float) -> mpf:
    """Corners by the law of cosines, then V₂/V₁ of the corners (V₀ drops out)."""
    with mp.workdps(50):
        c, a, b = mpf(v_ab), mpf(v_bc), mpf(v_ca)
        angle = mp.acos((c * c + b * b - a * a) / (2 * c * b))  # at corner A
        corner_a, corner_b = mpc(0), mpc(-c)
        corner_c = -b * mp.expj(-angle)
        turn = mp.expjpi(mpf(2) / 3)
        v_1 = corner_a + turn * corner_b + turn**2 * corner_c
        v_2 = corner_a + turn**2 * corner_b + turn * corner_c
        small, large = sorted((abs(v_1), abs(v_2)))
        return small / large  # the triangle alone does not say which way it turns


SIDES = st.tuples(*[st.floats(100.0, 700.0)] * 3)


@given(SIDES)
def test_any_closed_triangle(sides: tuple[float, float, float]) -> None:
    short, middle, long = sorted(sides)
    assume(long < 0.999 * (short + middle))
    value = one(*sides)
    assert math.isclose(value, by_geometry(*sides), rel_tol=1e-12, abs_tol=1e-24)
    assert math.isclose(value, by_beta(*sides), rel_tol=1e-12, abs_tol=1e-24)
    assert 0.0 <= value < 1.0


@given(
    st.floats(100.0, 30_000.0),
    st.floats(-1.0, 1.0),
    st.floats(-1.0, 1.0),
    st.integers(2, 15),
)
def test_near_balance_to_the_last_digits(base: float, x: float, y: float, decade: int) -> None:
    sides = (base, base * (1 + x * 10.0**-decade), base * (1 + y * 10.0**-decade))
    value, exact = one(*sides), by_beta(*sides)
    if sides[0] == sides[1] == sides[2]:
        assert value == 0.0
    else:
        assert abs(value - exact) <= mpf("1e-12") * exact


@given(
    st.floats(150.0, 300.0),
    st.floats(0.0, 0.5),
    st.floats(0.0, 2 * math.pi),
    st.complex_numbers(max_magnitude=200.0),
)
def test_phasors_of_known_sequence(v_1: float, share: float, angle: float, v_0: complex) -> None:
    turn = complex(-0.5, math.sqrt(3) / 2)
    v_2 = v_1 * share * complex(math.cos(angle), math.sin(angle))
    v = np.array([[v_0 + turn ** (-k) * v_1 + turn**k * v_2] for k in range(3)])
    value = float(voltage_unbalance_from_lines(line_voltages(v))[0])
    assert math.isclose(value, share, abs_tol=1e-12)
    _, positive, negative = sequence_components(v)
    assert math.isclose(value, float(abs(negative[0]) / abs(positive[0])), abs_tol=1e-12)


@given(matrix(1, -1.0, 1.0), st.floats(1e-6, 0.2))
def test_between_the_line_voltage_deviation_and_two_over_root_three_of_it(
    spread: Floats, size: float
) -> None:
    spread = spread - spread.mean()
    assume(np.abs(spread).max() > 1e-3)
    sides = 400.0 * (1.0 + size * spread / np.abs(spread).max())
    lvur = float(deviation_from_mean(sides)[0])
    ratio = float(voltage_unbalance_from_lines(sides)[0]) / lvur
    # The bounds are those of small imbalance; they widen in proportion to it.
    assert 1.0 - 0.3 * lvur - 1e-9 <= ratio <= 2 / math.sqrt(3) + 0.3 * lvur + 1e-9


@given(SIDES, st.integers(-8, 8))
def test_only_the_shape_counts(sides: tuple[float, float, float], power: int) -> None:
    d, e, f = sides
    plain = one(d, e, f)
    scaled = one(*(x * 2.0**power for x in sides))
    assert plain == scaled or (math.isnan(plain) and math.isnan(scaled))
    for order in ((e, f, d), (f, d, e), (e, d, f)):
        turned = one(*order)
        assert math.isclose(plain, turned, rel_tol=1e-13) or (
            math.isnan(plain) and math.isnan(turned)
        )


def test_three_values_that_close_no_triangle() -> None:
    assert math.isnan(one(400.0, 400.0, 900.0))
    assert math.isnan(one(0.0, 0.0, 0.0))
    assert math.isnan(one(400.0, math.nan, 400.0))
    assert one(200.0, 200.0, 400.0) == 1.0  # flat: V₂ as large as V₁
    assert one(400.0, 400.0, 400.0) == 0.0


def test_phase_voltages_are_not_what_it_takes() -> None:
    # A neutral shift: balanced lines, unequal phases. The formula fed with phases errs.
    turn = complex(-0.5, math.sqrt(3) / 2)
    v = np.array([[230.0 + 20.0], [230.0 * turn**2 + 20.0], [230.0 * turn + 20.0]])
    assert one(*line_voltages(v)[:, 0]) < 1e-12
    assert one(*np.abs(v)[:, 0]) > 0.05
