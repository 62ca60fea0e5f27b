"""All derived quantities of a batch of intervals of a four-wire wye service.

This is where the single formulas of the kernel meet: the order of precedence between
metered and reconstructed power, the light-load floor, and the angle grades.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from meterlens.electrical import balance, conventions, impedance, phasors, power
from meterlens.electrical.conventions import BoolArray, Flag, FloatArray
from meterlens.electrical.phase_power import (
    PhasePower,
    TotalPower,
    flag_where,
    phase_power,
    total_power,
)
from meterlens.electrical.readings import IntervalReadings, ServiceConstants

__all__ = [
    "CURRENT_ANGLE_GRADES",
    "VOLTAGE_ANGLE_GRADES",
    "IntervalQuantities",
    "IntervalReadings",
    "ServiceConstants",
    "derive_intervals",
]

VOLTAGE_ANGLE_GRADES = ("measured", "triangle", "nominal")
CURRENT_ANGLE_GRADES = ("per-phase", "shared", "equal")


@dataclass(frozen=True)
class IntervalQuantities:
    """Derived quantities in SI units; NaN where not known.

    Attributes
    ----------
    p, q, s, pf, r_wye, x_wye : FloatArray
        Shape (3, n): W, var, VA, fraction signed as P, ohm.
    p_total, q_total, s_vector, s_arithmetic, s_effective : FloatArray
        Shape (n,): W, var, VA.
    pf_vector, pf_arithmetic, pf_effective : FloatArray
        Shape (n,), signed as P.
    r_delta, x_delta : FloatArray
        Shape (n,): balanced delta equivalent, ohm.
    vuf, lvur, pvur, iuf2, iuf0, current_unbalance : FloatArray
        Shape (n,), fractions.
    i_neutral : FloatArray
        Shape (n,): estimated neutral current, A.
    voltage_angle_grade, current_angle_grade : str
        One of the grades above; the same for every interval of a map.
    flags : ndarray of uint16
        Shape (n,): bits of :class:`conventions.Flag`.
    """

    p: FloatArray
    q: FloatArray
    s: FloatArray
    pf: FloatArray
    r_wye: FloatArray
    x_wye: FloatArray
    p_total: FloatArray
    q_total: FloatArray
    s_vector: FloatArray
    s_arithmetic: FloatArray
    s_effective: FloatArray
    pf_vector: FloatArray
    pf_arithmetic: FloatArray
    pf_effective: FloatArray
    r_delta: FloatArray
    x_delta: FloatArray
    vuf: FloatArray
    lvur: FloatArray
    pvur: FloatArray
    iuf2: FloatArray
    iuf0: FloatArray
    current_unbalance: FloatArray
    i_neutral: FloatArray
    voltage_angle_grade: str
    current_angle_grade: str
    flags: npt.NDArray[np.uint16]


def derive_intervals(readings: IntervalReadings, service: ServiceConstants) -> IntervalQuantities:
    """Every derived quantity of a batch of intervals at angle grade ``nominal``.

    Parameters
    ----------
    readings : IntervalReadings
        n intervals in SI units.
    service : ServiceConstants
        Settings of the service and its export.

    Returns
    -------
    IntervalQuantities
        Arrays of n intervals. The result of an interval does not depend on its
        neighbours, so a record may be cut into batches anywhere.

    Raises
    ------
    ValueError
        No column at all, or a phase sequence that is neither ``abc`` nor ``acb``.

    Notes
    -----
    Metered kW and kvar win over V·I·PF; S of a phase stays V·I. Ratios (PF, impedance,
    imbalance) of a phase are NaN where its current is under the floor, those of the
    interval where the largest phase current is. P, Q, S and the neutral estimate are
    kept. A power factor not printed at a current under the floor is an interval without
    load (P = Q = 0). Without any currents the floor applies to the current that the
    total power would draw at nominal voltage.

    References
    ----------
    IEEE Std 1459-2010 (powers), IEC 61000-4-30 (voltage unbalance), NEMA MG 1 (LVUR).
    """
    n = readings.count
    unknown = np.full((3, n), np.nan)
    v = unknown if readings.v is None else readings.v
    i = unknown if readings.i is None else readings.i
    with np.errstate(invalid="ignore", over="ignore"):
        idle = i < service.floor_a  # False where the current is not known
        phases = phase_power(readings, v, i, idle, service)
        total = total_power(readings, phases, idle, service)
        loaded = _loaded(i, total, service)
        r_wye, x_wye = impedance.wye_impedance(v, i, phases.p, phases.q)
        for x in (r_wye, x_wye):
            x[idle | ~np.isfinite(x)] = np.nan
        network = _network_quantities(readings, v, i, phases, loaded, service)
        s_effective = network.pop("s_effective")
        # Totals that cancel leave rounding noise, whose ratio means nothing.
        standing = loaded & ~(total.s_vector < 1e-9 * total.s_arithmetic)
        return IntervalQuantities(
            p=phases.p,
            q=phases.q,
            s=phases.s,
            pf=power.power_factor(phases.p, phases.s, ~idle),
            r_wye=r_wye,
            x_wye=x_wye,
            p_total=total.p,
            q_total=total.q,
            s_vector=total.s_vector,
            s_arithmetic=total.s_arithmetic,
            s_effective=s_effective,
            pf_vector=power.power_factor(total.p, total.s_vector, standing),
            pf_arithmetic=power.power_factor(total.p, total.s_arithmetic, loaded),
            pf_effective=power.power_factor(total.p, s_effective, loaded),
            voltage_angle_grade="nominal",
            current_angle_grade=_current_angle_grade(readings),
            flags=phases.flags | total.flags | _load_flags(readings, idle, loaded, network),
            **network,
        )


def _load_flags(
    readings: IntervalReadings,
    idle: BoolArray,
    loaded: BoolArray,
    network: dict[str, FloatArray],
) -> npt.NDArray[np.uint16]:
    """Why ratios of the interval, of one phase or of the voltages are not known."""
    flags = flag_where(~loaded, Flag.LIGHT_LOAD)
    flags |= flag_where(loaded & idle.any(axis=0), Flag.LIGHT_PHASE)
    if readings.v_line is not None:
        open_triangle = ~np.isnan(readings.v_line).any(axis=0) & np.isnan(network["vuf"])
        flags |= flag_where(open_triangle & loaded, Flag.ANGLES_DO_NOT_CLOSE)
    return flags


def _current_angle_grade(readings: IntervalReadings) -> str:
    if readings.pf is not None or readings.p is not None:
        return "per-phase"
    if readings.pf_total is not None or readings.p_total is not None:
        return "shared"
    return "equal"


def _loaded(i: FloatArray, total: TotalPower, service: ServiceConstants) -> BoolArray:
    """True where the interval as a whole is not known to be under the light-load floor."""
    apparent = np.where(np.isnan(total.s_vector), np.abs(total.p), total.s_vector)
    equivalent = apparent / (np.sqrt(3.0) * service.nominal_line_v)
    largest = np.fmax.reduce(i, axis=0)
    largest = np.where(np.isnan(largest), equivalent, largest)
    return np.asarray(~(largest < service.floor_a))


def _network_quantities(
    readings: IntervalReadings,
    v: FloatArray,
    i: FloatArray,
    phases: PhasePower,
    loaded: BoolArray,
    service: ServiceConstants,
) -> dict[str, FloatArray]:
    """What needs the three phases as phasors."""
    rotation = conventions.phase_rotation(service.sequence)
    v_phasor = phasors.nominal_voltage_phasors(v, service.sequence)
    if _current_angle_grade(readings) == "equal":
        i_phasor = i * rotation
    else:
        i_phasor = phasors.current_phasors(i, phases.p, phases.q, rotation)
    _, v_1, v_2 = phasors.sequence_components(v_phasor)
    i_0, i_1, i_2 = phasors.sequence_components(i_phasor)
    if service.sequence == "acb":
        v_1, v_2, i_1, i_2 = v_2, v_1, i_2, i_1
    i_neutral = 3.0 * np.abs(i_0)
    v_line = phasors.line_voltages(v_phasor)
    vuf = balance.sequence_ratio(v_2, v_1)
    lvur = balance.deviation_from_mean(v_line)
    if readings.v_line is not None:  # magnitudes as metered need no angle, and stand alone
        vuf = balance.voltage_unbalance_from_lines(readings.v_line)
        lvur = balance.deviation_from_mean(readings.v_line)
    z_delta = impedance.balanced_delta_impedance(v_1, i_1)
    if _current_angle_grade(readings) == "equal":
        z_delta = np.full_like(z_delta, complex(np.nan, np.nan))
    ratios = {
        "r_delta": z_delta.real,
        "x_delta": z_delta.imag,
        "vuf": vuf,
        "lvur": lvur,
        "pvur": balance.deviation_from_mean(v),
        "iuf2": balance.sequence_ratio(i_2, i_1),
        "iuf0": balance.sequence_ratio(i_0, i_1),
        "current_unbalance": balance.deviation_from_mean(i),
    }
    kept = {
        name: np.where(loaded & np.isfinite(value), value, np.nan) for name, value in ratios.items()
    }
    kept["i_neutral"] = i_neutral
    kept["s_effective"] = power.apparent_power_effective(v, v_line, i, i_neutral)
    return kept
