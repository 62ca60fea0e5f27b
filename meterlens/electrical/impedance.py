"""Equivalent impedances at the terminals of a load."""

from __future__ import annotations

import numpy as np

from meterlens.electrical.conventions import ComplexArray, FloatArray

__all__ = [
    "balanced_delta_impedance",
    "delta_from_wye",
    "wye_from_delta",
    "wye_impedance",
]


def wye_impedance(
    v: FloatArray, i: FloatArray, p: FloatArray, q: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Series resistance and reactance of the wye equivalent of each phase.

    Parameters
    ----------
    v, i : FloatArray
        Line-to-neutral voltage, V, and line current, A, rms.
    p, q : FloatArray
        Active and reactive power of the phase, W and var; only their angle is used.

    Returns
    -------
    tuple of FloatArray
        R = (V/I) cos φ and X = (V/I) sin φ, ohm, with φ = atan2(Q, P). R < 0 where the
        phase exports, X < 0 where Q leads. Infinite or NaN at no current: the caller
        blanks light load.

    Notes
    -----
    cos φ = P/√(P² + Q²) directly, without going through the angle.
    """
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        scale = v / (i * np.sqrt(p * p + q * q))
        return np.asarray(scale * p), np.asarray(scale * q)


def balanced_delta_impedance(v_positive: ComplexArray, i_positive: ComplexArray) -> ComplexArray:
    """Delta equivalent of the balanced part of a load: Z_Δ = 3 V₁/I₁.

    Parameters
    ----------
    v_positive, i_positive : ComplexArray
        Positive-sequence voltage, V, and current, A.

    Returns
    -------
    ComplexArray
        Ohm per delta element; not finite at no current.

    Notes
    -----
    Equal wye elements Z are equal delta elements 3 Z. The elements of an unequal delta
    cannot be told from its terminals on a four-wire service, so only the balanced part
    is shown.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(3.0 * v_positive / i_positive)


def delta_from_wye(z: ComplexArray) -> ComplexArray:
    """Delta elements ab, bc, ca of a wye whose star point is not connected.

    Parameters
    ----------
    z : ComplexArray
        Shape (3, …): Z_a, Z_b, Z_c, ohm; infinite for an open phase.

    Returns
    -------
    ComplexArray
        Z_ab, Z_bc, Z_ca, ohm: 1/Y_ab with Y_ab = Y_a Y_b/(Y_a + Y_b + Y_c), cyclic.

    Notes
    -----
    By admittances, so that an open phase (Y = 0) stays finite on the other side.

    References
    ----------
    Star-mesh transformation; Kennelly, 1899 (citation from memory).
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        y = np.where(np.isinf(z), 0.0, 1.0 / np.where(np.isinf(z), 1.0, z))
        return np.asarray(y.sum(axis=0) / (y * np.roll(y, -1, axis=0)))


def wye_from_delta(z: ComplexArray) -> ComplexArray:
    """Wye elements a, b, c of a delta.

    Parameters
    ----------
    z : ComplexArray
        Shape (3, …): Z_ab, Z_bc, Z_ca, ohm.

    Returns
    -------
    ComplexArray
        Z_a, Z_b, Z_c, ohm: Z_a = Z_ab Z_ca/(Z_ab + Z_bc + Z_ca), cyclic; NaN where an
        element is open (infinite).
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(z * np.roll(z, 1, axis=0) / z.sum(axis=0))
