"""Active, reactive and apparent power, per phase and in total."""

from __future__ import annotations

import numpy as np

from meterlens.electrical.conventions import PF_CLAMP_BOUND, BoolArray, FloatArray

__all__ = [
    "apparent_power_effective",
    "apparent_power_vector",
    "power_factor",
    "power_factor_of_totals",
    "reactive_power_from_apparent",
    "reactive_power_from_power_factor",
    "tangent_of_power_factor",
    "total_where_carried",
]


def reactive_power_from_power_factor(s: FloatArray, magnitude: FloatArray) -> FloatArray:
    """Magnitude of the reactive power behind a power factor.

    Parameters
    ----------
    s : FloatArray
        Apparent power, VA.
    magnitude : FloatArray
        |PF|, 0 to 1.

    Returns
    -------
    FloatArray
        |Q| = S·√((1 − PF)(1 + PF)), var. NaN where either is NaN.

    Notes
    -----
    The product form keeps its digits near unity, where 1 − PF² cancels.

    References
    ----------
    IEEE Std 1459-2010, 3.1 (single-phase sinusoidal): S² = P² + Q².
    """
    return np.asarray(s * np.sqrt((1.0 - magnitude) * (1.0 + magnitude)))


def reactive_power_from_apparent(s: FloatArray, p: FloatArray) -> FloatArray:
    """Magnitude of the reactive power from apparent and active power.

    Parameters
    ----------
    s, p : FloatArray
        VA and W.

    Returns
    -------
    FloatArray
        √((S − |P|)(S + |P|)), var; 0 where |P| exceeds S (rounding in the meter).

    References
    ----------
    IEEE Std 1459-2010, 3.1: S² = P² + Q².
    """
    active = np.abs(p)
    return np.asarray(np.sqrt(np.maximum((s - active) * (s + active), 0.0)))


def tangent_of_power_factor(magnitude: FloatArray) -> FloatArray:
    """Tangent of the angle of a power factor: √((1 − PF)(1 + PF))/PF.

    Parameters
    ----------
    magnitude : FloatArray
        |PF|, 0 to 1, dimensionless.

    Returns
    -------
    FloatArray
        tan φ ≥ 0; infinite at PF 0.

    References
    ----------
    Common practice in capacitor sizing: Q_c = P (tan φ₁ − tan φ₂).
    """
    pf = np.asarray(magnitude, dtype=np.float64)
    with np.errstate(divide="ignore"):
        return np.asarray(np.sqrt((1.0 - pf) * (1.0 + pf)) / pf)


def apparent_power_vector(p: FloatArray, q: FloatArray) -> FloatArray:
    """Vector apparent power.

    Parameters
    ----------
    p, q : FloatArray
        Total active and reactive power, W and var; or energies, kWh and kvarh.

    Returns
    -------
    FloatArray
        √(P² + Q²), VA (or kVAh).

    References
    ----------
    IEEE Std 1459-2010, 3.2.2.6.
    """
    return np.asarray(np.sqrt(p * p + q * q))


def power_factor_of_totals(p: float | None, q: float | None) -> float | None:
    """Power factor of total powers, or of the energies of a month or a period.

    Parameters
    ----------
    p, q : float or None
        kW and kvar, or kWh and net kvarh; None where not known.

    Returns
    -------
    float or None
        P/√(P² + Q²), dimensionless, signed as P; None where either is not known or both
        are zero.

    Notes
    -----
    With energies this is the average power factor of tariffs. A power factor is never
    averaged.
    """
    if p is None or q is None:
        return None
    s = float(apparent_power_vector(np.array(p), np.array(q)))
    return p / s if s > 0 else None


def power_factor(p: FloatArray, s: FloatArray, known: BoolArray) -> FloatArray:
    """P over S, signed as P.

    Parameters
    ----------
    p, s : FloatArray
        W and VA.
    known : BoolArray
        False where the load is too light for a ratio to mean anything.

    Returns
    -------
    FloatArray
        P/S between -1 and 1; NaN where not `known`, where S is 0, or where metered P
        exceeds S by more than half a percent (the two do not belong together). A smaller
        excess is rounding and is clamped.

    References
    ----------
    IEEE Std 1459-2010, 3.1.1.8 and 3.2.2.7.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = p / s
    believable = known & (s > 0) & (np.abs(ratio) <= PF_CLAMP_BOUND)
    return np.where(believable, np.clip(ratio, -1.0, 1.0), np.nan)


def total_where_carried(per_phase: FloatArray, carries: BoolArray) -> FloatArray:
    """Sum over the phases, not known where a loaded phase is not known.

    Parameters
    ----------
    per_phase : FloatArray
        Shape (3, n): W, var or VA.
    carries : BoolArray
        Shape (3, n): the phase carries current, or its current is itself not known.

    Returns
    -------
    FloatArray
        Shape (n,). A phase without current adds nothing and spoils nothing; where no phase
        is known, neither is the total.
    """
    unknown = np.isnan(per_phase)
    a, b, c = np.where(unknown & ~carries, 0.0, per_phase)
    return np.where(unknown.all(axis=0), np.nan, a + b + c)


def apparent_power_effective(
    v: FloatArray, v_line: FloatArray, i: FloatArray, i_neutral: FloatArray
) -> FloatArray:
    """Effective apparent power of a four-wire service.

    Parameters
    ----------
    v : FloatArray
        Shape (3, n): line-to-neutral voltages, V.
    v_line : FloatArray
        Shape (3, n): line-to-line voltages ab, bc, ca, V.
    i : FloatArray
        Shape (3, n): line currents, A.
    i_neutral : FloatArray
        Shape (n,): neutral current, A.

    Returns
    -------
    FloatArray
        Shape (n,): S_e = 3 V_e I_e, VA.

    Notes
    -----
    I_e = √((I_a² + I_b² + I_c² + I_n²)/3), V_e = √((3 Σ V_k² + Σ V_kl²)/18): neutral of
    the same resistance as the lines (ρ = 1) and equal shares of wye and delta load
    (ξ = 1).

    References
    ----------
    IEEE Std 1459-2010, 3.2.2.8.
    """
    current_square = i[0] * i[0] + i[1] * i[1] + i[2] * i[2] + i_neutral * i_neutral
    phase_square = v[0] * v[0] + v[1] * v[1] + v[2] * v[2]
    line_square = v_line[0] * v_line[0] + v_line[1] * v_line[1] + v_line[2] * v_line[2]
    # 3·√(I²/3)·√(V²/18) under one root.
    return np.asarray(np.sqrt(current_square * (3.0 * phase_square + line_square) / 6.0))
