"""Measures of imbalance. Each has one definition and one name."""

from __future__ import annotations

import numpy as np

from meterlens.electrical.conventions import ComplexArray, FloatArray

__all__ = [
    "deviation_from_mean",
    "sequence_ratio",
    "voltage_unbalance_from_lines",
]


def deviation_from_mean(x: FloatArray) -> FloatArray:
    """Largest deviation of three magnitudes from their mean, over the mean.

    Parameters
    ----------
    x : FloatArray
        Shape (3, n). Line-to-line voltages give ``lvur``, line-to-neutral ones ``pvur``,
        line currents ``current_unbalance``.

    Returns
    -------
    FloatArray
        Shape (n,), a fraction; NaN where a value is not known or all are zero.

    References
    ----------
    NEMA MG 1, 14.36 and 20.24 (line-to-line voltages; clause numbers from memory); the
    same arithmetic on phase voltages is the "phase voltage unbalance rate" of the trade.
    """
    x_a, x_b, x_c = x
    mean = (x_a + x_b + x_c) / 3.0
    with np.errstate(divide="ignore", invalid="ignore"):
        largest = np.maximum(np.maximum(np.abs(x_a - mean), np.abs(x_b - mean)), np.abs(x_c - mean))
        return np.where(mean > 0, largest / mean, np.nan)


def sequence_ratio(part: ComplexArray, positive: ComplexArray) -> FloatArray:
    """Magnitude of one sequence component over the positive one.

    Parameters
    ----------
    part, positive : ComplexArray
        Shape (n,): a negative- or zero-sequence component and the positive-sequence one.

    Returns
    -------
    FloatArray
        Shape (n,), a fraction; NaN where the positive sequence is zero.

    References
    ----------
    IEC 61000-4-30, 5.7.1 (voltage: negative and zero sequence ratios).
    """
    base = np.abs(positive)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(base > 0, np.abs(part) / base, np.nan)


def voltage_unbalance_from_lines(v_line: FloatArray) -> FloatArray:
    """|V₂|/|V₁| from the three line-to-line magnitudes alone.

    Parameters
    ----------
    v_line : FloatArray
        Shape (3, n): V_ab, V_bc, V_ca, V. Never line-to-neutral values: those do not
        determine V₂ wherever V₀ is not zero.

    Returns
    -------
    FloatArray
        Shape (n,), a fraction; NaN where the three do not close a triangle.

    Notes
    -----
    With sides d, e, f and T their triangle's area,

        √(2[(d²−e²)² + (e²−f²)² + (f²−d²)²]) / (d² + e² + f² + 4√3 T),

    equal to the β form √((1−√(3−6β))/(1+√(3−6β))) but good to the last digits near
    balance, where β cancels. T is Kahan's form of Heron's, sorted so that no difference
    of nearly equal sums is taken.

    References
    ----------
    IEC 61000-4-30, 5.7.1; W. Kahan, "Miscalculating area and angles of a needle-like
    triangle" (from memory).
    """
    d, e, f = v_line
    short, middle, long = np.sort(v_line, axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        area = 0.25 * np.sqrt(
            (long + (middle + short))
            * (short - (long - middle))
            * (short + (long - middle))
            * (long + (middle - short))
        )
        # (d−e)(d+e) keeps the digits that d² − e² would lose.
        de, ef, fd = (d - e) * (d + e), (e - f) * (e + f), (f - d) * (f + d)
        spread = np.sqrt(2.0 * (de * de + ef * ef + fd * fd))
        return np.asarray(spread / (d * d + e * e + f * f + 4.0 * np.sqrt(3.0) * area))
