"""Phasors from magnitudes, and symmetrical components."""

from __future__ import annotations

import numpy as np

from meterlens.electrical.conventions import ComplexArray, FloatArray, phase_rotation

__all__ = ["current_phasors", "line_voltages", "nominal_voltage_phasors", "sequence_components"]


def nominal_voltage_phasors(v: FloatArray, sequence: str) -> ComplexArray:
    """Line-to-neutral phasors with the angles of a balanced supply.

    Parameters
    ----------
    v : FloatArray
        Shape (3, n): line-to-neutral magnitudes, V.
    sequence : str
        ``abc`` or ``acb``.

    Returns
    -------
    ComplexArray
        Shape (3, n): V_a∠0, V_b∠∓120°, V_c∠±120°.

    Notes
    -----
    Angle grade ``nominal``: the magnitudes alone do not determine the angles, so all that
    is built on these phasors is an estimate.
    """
    return np.asarray(v * phase_rotation(sequence))


def line_voltages(v: ComplexArray) -> FloatArray:
    """Magnitudes of V_ab, V_bc, V_ca from line-to-neutral phasors.

    Parameters
    ----------
    v : ComplexArray
        Shape (3, n), V.

    Returns
    -------
    FloatArray
        Shape (3, n), V.
    """
    return np.abs(v - np.roll(v, -1, axis=0))


def current_phasors(
    i: FloatArray, p: FloatArray, q: FloatArray, rotation: ComplexArray
) -> ComplexArray:
    """Line current phasors, each turned from its voltage by the angle of its power.

    Parameters
    ----------
    i : FloatArray
        Shape (3, n): line currents, A.
    p, q : FloatArray
        Shape (3, n): active and reactive power of the phase, W and var.
    rotation : ComplexArray
        Shape (3, 1) or (3, n): unit phasors of the voltages.

    Returns
    -------
    ComplexArray
        Shape (3, n): I∠(θ − φ) with φ = atan2(Q, P). With P = Q = 0 the angle is that of
        the voltage, atan2(0, 0) being 0; NaN where P or Q is not known.
    """
    magnitude = np.sqrt(p * p + q * q)
    still = magnitude == 0.0
    magnitude[still] = 1.0
    factor = i / magnitude
    turned = np.empty(i.shape, dtype=np.complex128)
    turned.real = factor * np.where(still, 1.0, p)
    turned.imag = -(factor * q)
    turned *= rotation
    return turned


def sequence_components(x: ComplexArray) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
    """Zero, positive and negative sequence of three phasors.

    Parameters
    ----------
    x : ComplexArray
        Shape (3, …): phasors of phases a, b, c.

    Returns
    -------
    tuple of ComplexArray
        X₀ = (X_a + X_b + X_c)/3, X₁ = (X_a + aX_b + a²X_c)/3, X₂ = (X_a + a²X_b + aX_c)/3
        with a = 1∠120°, in the unit of `x`.

    References
    ----------
    Fortescue, "Method of symmetrical co-ordinates", 1918 (citation from memory).

    Notes
    -----
    "Positive" is the sequence abc. For a service of sequence acb the caller takes the two
    in turn.
    """
    x_a, x_b, x_c = x
    both = x_b + x_c
    across = (x_b - x_c) * (1j * np.sqrt(3.0) / 2.0)
    middle = x_a - 0.5 * both
    return (
        np.asarray((x_a + both) / 3.0),
        np.asarray((middle + across) / 3.0),
        np.asarray((middle - across) / 3.0),
    )
