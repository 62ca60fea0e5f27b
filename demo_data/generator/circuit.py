"""One service: a stiff source behind impedances, and loads as phasors on its terminals.

Voltage sources stand exactly 120° apart and differ a little in magnitude; the drop over
the source impedance then moves the terminal angles by no more than a few tenths of a
degree. That keeps the 120° that must be assumed where only line-to-neutral magnitudes
are metered close to the truth, and it is still not exact, as on a real site.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from generator.clock import Grid

Floats = NDArray[np.float64]
Phasors = NDArray[np.complex128]

NOMINAL_LN_V = 400.0 / 3.0**0.5
A = complex(-0.5, 0.75**0.5)
"""The turn by 120°."""
TURN = np.array([[1.0 + 0.0j], [A * A], [A]])
"""Positive sequence a, b, c."""


@dataclass(frozen=True)
class Source:
    """Impedance from a stiff source to the meter, ohm per phase and in the neutral."""

    z_phase_ohm: complex
    z_neutral_ohm: complex


@dataclass(frozen=True)
class Load:
    """What hangs on the terminals.

    Attributes
    ----------
    power : ndarray, shape (3, n)
        Constant complex power of each phase, VA (lagging positive).
    admittance : ndarray, shape (3, n)
        Constant admittance of each phase to neutral, siemens.
    motors : ndarray, shape (n,)
        Complex power of three-phase motors, VA in all: constant on the positive
        sequence, and an admittance on the negative sequence of `motor_start_ratio`
        times the running one (about the starting current in per unit), which is why a
        small voltage imbalance makes a large current imbalance.
    motor_start_ratio : float
        Negative-sequence admittance over running admittance.
    """

    power: Phasors
    admittance: Phasors
    motors: Phasors
    motor_start_ratio: float = 6.5


@dataclass(frozen=True)
class Record:
    """The true values of one service, interval by interval.

    Attributes
    ----------
    grid : Grid
        Interval starts.
    v, i : ndarray of complex, shape (3, n)
        Terminal voltages to neutral (V) and line currents (A).
    i_neutral_a : ndarray, shape (n,)
        Neutral current as a meter reads it, A; with triplen harmonics where the
        service has them.
    rating_a : float
        The service's rating, A.
    """

    grid: Grid
    v: Phasors
    i: Phasors
    i_neutral_a: Floats
    rating_a: float


def capacitor_siemens(kvar: Floats) -> Phasors:
    """Return the admittance of each phase of a bank of `kvar` at nominal voltage."""
    one = 1j * np.asarray(kvar) * 1000.0 / (3.0 * NOMINAL_LN_V**2)
    return np.broadcast_to(one, (3, one.size)).copy()


def source_voltages(per_unit: Floats, each_phase: Floats) -> Phasors:
    """Return source phasors from a common level (n,) and factors (3, n) of each phase."""
    return np.asarray(NOMINAL_LN_V * per_unit * each_phase * TURN, dtype=np.complex128)


def _motor_currents(v: Phasors, load: Load) -> Phasors:
    v1 = (v[0] + A * v[1] + A * A * v[2]) / 3.0
    v2 = (v[0] + A * A * v[1] + A * v[2]) / 3.0
    i1 = np.conj(load.motors / (3.0 * v1))
    running = np.abs(load.motors) / (3.0 * NOMINAL_LN_V**2)
    # A motor at standstill is nearly a reactance: power factor about 0.2.
    i2 = load.motor_start_ratio * running * (0.2 - 0.98j) * v2
    return np.stack([i1 + i2, A * A * i1 + A * i2, A * i1 + A * A * i2])


def solve(times: Grid, supply: Phasors, load: Load, source: Source, rating_a: float) -> Record:
    """Return the record that a supply and its loads settle on.

    Raises
    ------
    RuntimeError
        If the voltages do not settle: the load is too heavy for its source.
    """
    v = supply.copy()
    for _ in range(60):
        i = np.conj(load.power / v) + load.admittance * v + _motor_currents(v, load)
        neutral = i.sum(axis=0)
        settled = supply - source.z_phase_ohm * i - source.z_neutral_ohm * neutral
        change = float(np.abs(settled - v).max())
        v = settled
        if change < 1e-9:
            return Record(times, v, i, np.abs(neutral), rating_a)
    raise RuntimeError("the demo circuit does not settle: a load is too heavy for its source")
