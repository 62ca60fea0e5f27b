"""Random intervals for the laws of the electrical kernel, and how results are compared."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import numpy.typing as npt
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from meterlens.electrical.conventions import PowerFactorSense
from meterlens.electrical.interval import (
    IntervalQuantities,
    IntervalReadings,
    ServiceConstants,
    derive_intervals,
)

Floats = npt.NDArray[np.float64]

PER_PHASE = ("p", "q", "s", "pf", "r_wye", "x_wye")
TOTALS = ("p_total", "q_total", "s_vector", "s_arithmetic", "s_effective")
PF_TOTALS = ("pf_vector", "pf_arithmetic", "pf_effective")
IMBALANCE = ("vuf", "lvur", "pvur", "iuf2", "iuf0", "current_unbalance")
EVERY = (*PER_PHASE, *TOTALS, *PF_TOTALS, *IMBALANCE, "r_delta", "x_delta", "i_neutral")

FLOOR_A = 4.0
SIGNED = PowerFactorSense("sign-is-power-flow", assumed=1)
SERVICE = ServiceConstants("abc", 400.0, FLOOR_A, SIGNED)
MIRRORED = replace(SERVICE, sequence="acb")


def matrix(n: int, low: float, high: float) -> st.SearchStrategy[Floats]:
    """Shape (3, n), evenly over the range."""
    return hnp.arrays(np.float64, (3, n), elements=st.floats(low, high))


@st.composite
def consuming(draw: st.DrawFn, most: int = 5, level_voltages: bool = False) -> IntervalReadings:
    """Loaded intervals without holes: every phase imports, lagging or leading."""
    n = draw(st.integers(1, most))
    v = draw(matrix(n, 150.0, 300.0))
    if level_voltages:
        v = np.repeat(v[:1], 3, axis=0)
    lead_lag = draw(hnp.arrays(np.float64, (3, n), elements=st.sampled_from([1.0, -1.0])))
    return IntervalReadings(
        v=v, i=draw(matrix(n, 5.0, 500.0)), pf=draw(matrix(n, 0.3, 1.0)), lead_lag=lead_lag
    )


@st.composite
def anything(draw: st.DrawFn, most: int = 6) -> IntervalReadings:
    """Intervals as exports have them: idle phases, exporting phases, holes."""
    n = draw(st.integers(1, most))

    def column(low: float, high: float, *odd: float) -> Floats:
        elements = st.one_of(st.floats(low, high), st.floats(low, high), st.sampled_from(odd))
        return draw(hnp.arrays(np.float64, (3, n), elements=elements))

    return IntervalReadings(
        v=column(150.0, 300.0, np.nan, 0.0),
        # Never between zero and a microampere or a millionth: squares would underflow.
        i=column(1e-6, 500.0, np.nan, 0.0, FLOOR_A, 1.0),
        pf=column(-1.0, 1.0, np.nan, 0.0, 1.0),
        lead_lag=column(1.0, 1.0, np.nan, -1.0),
    )


def cut(readings: IntervalReadings, part: slice | list[int]) -> IntervalReadings:
    """The same columns for some of the intervals only."""
    given = {f.name: getattr(readings, f.name) for f in fields(readings)}
    return IntervalReadings(**{k: x[..., part] for k, x in given.items() if x is not None})


def permuted(readings: IntervalReadings, order: list[int]) -> IntervalReadings:
    """Phases in another order."""
    given = {f.name: getattr(readings, f.name) for f in fields(readings)}
    return IntervalReadings(**{k: x[order] for k, x in given.items() if x is not None})


def derive(readings: IntervalReadings, service: ServiceConstants = SERVICE) -> IntervalQuantities:
    return derive_intervals(readings, service)


def identical(first: Floats, second: Floats, name: str = "") -> None:
    """Equal to the bit: NaN with NaN, -0.0 with -0.0."""
    np.testing.assert_array_equal(first, second, err_msg=name)
    known = ~np.isnan(first)
    np.testing.assert_array_equal(np.signbit(first[known]), np.signbit(second[known]), name)


def close(first: Floats, second: Floats, scale: Floats | float, name: str = "") -> None:
    """Equal within 1e-11 of a scale, and known at the same places."""
    np.testing.assert_array_equal(np.isnan(first), np.isnan(second), err_msg=name)
    known = ~np.isnan(first)
    size = np.broadcast_to(scale, first.shape)[known]
    assert np.all(np.abs(first[known] - second[known]) <= 1e-11 * size), name
