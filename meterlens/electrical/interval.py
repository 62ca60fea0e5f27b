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
class ServiceConstants:
    """What of a service's settings the kernel needs.

    Attributes
    ----------
    sequence : str
        ``abc`` or ``acb``.
    nominal_line_v : float
        Nominal line-to-line voltage, V.
    floor_a : float
        Light-load floor: below this current ratios mean nothing, A.
    power_factor : conventions.PowerFactorSense
        How the exported power factor reads.
    mismatch_fraction : float
        Share of S by which metered power may differ from V·I·PF unflagged.
    """

    sequence: str
    nominal_line_v: float
    floor_a: float
    power_factor: conventions.PowerFactorSense
    mismatch_fraction: float = 0.02


@dataclass(frozen=True)
class IntervalReadings:
    """Readings in SI units; None where the export has no such column.

    Attributes
    ----------
    v, i, pf, p, q, s : FloatArray or None
        Shape (3, n): line-to-neutral voltage, V; line current, A; power factor as
        printed; metered power, W, var, VA.
    v_line : FloatArray or None
        Shape (3, n): line-to-line voltages ab, bc, ca, V.
    lead_lag : FloatArray or None
        Shape (3, n): +1 lagging, -1 leading, NaN where not told.
    pf_total, p_total, q_total, s_total : FloatArray or None
        Shape (n,): one value for the three phases.
    """

    v: FloatArray | None = None
    i: FloatArray | None = None
    pf: FloatArray | None = None
    p: FloatArray | None = None
    q: FloatArray | None = None
    s: FloatArray | None = None
    v_line: FloatArray | None = None
    lead_lag: FloatArray | None = None
    pf_total: FloatArray | None = None
    p_total: FloatArray | None = None
    q_total: FloatArray | None = None
    s_total: FloatArray | None = None

    @property
    def count(self) -> int:
        """Number of intervals n."""
        return next(int(x.shape[-1]) for x in vars(self).values() if x is not None)


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


@dataclass(frozen=True)
class PhasePower:
    """Power of each phase and what it leans on; shapes (3, n), flags (n,)."""

    p: FloatArray
    q: FloatArray
    s: FloatArray
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
    with np.errstate(invalid="ignore"):
        idle = i < service.floor_a  # False where the current is not known
        phases = _phase_power(readings, v, i, idle, service)
        p_total, q_total, s_arithmetic = _totals(readings, phases, idle, service)
        s_vector = np.sqrt(p_total * p_total + q_total * q_total)
        loaded = _loaded(readings, i, s_vector, p_total, service)
        flags = phases.flags
        flags = flags | np.where(loaded, np.uint16(0), np.uint16(Flag.LIGHT_LOAD))
        flags |= np.where(np.isnan(p_total), np.uint16(Flag.INCOMPLETE), np.uint16(0))
        r_wye, x_wye = impedance.wye_impedance(v, i, phases.p, phases.q)
        for x in (r_wye, x_wye):
            x[idle | ~np.isfinite(x)] = np.nan
        network = _network_quantities(readings, v, i, phases, loaded, service)
        s_effective = network.pop("s_effective")
        return IntervalQuantities(
            p=phases.p,
            q=phases.q,
            s=phases.s,
            pf=power.power_factor(phases.p, phases.s, ~idle),
            r_wye=r_wye,
            x_wye=x_wye,
            p_total=p_total,
            q_total=q_total,
            s_vector=s_vector,
            s_arithmetic=s_arithmetic,
            s_effective=s_effective,
            pf_vector=power.power_factor(p_total, s_vector, loaded),
            pf_arithmetic=power.power_factor(p_total, s_arithmetic, loaded),
            pf_effective=power.power_factor(p_total, s_effective, loaded),
            voltage_angle_grade="nominal",
            current_angle_grade=_current_angle_grade(readings),
            flags=flags,
            **network,
        )


def _current_angle_grade(readings: IntervalReadings) -> str:
    if readings.pf is not None or readings.p is not None:
        return "per-phase"
    if readings.pf_total is not None or readings.p_total is not None:
        return "shared"
    return "equal"


def _phase_power(
    readings: IntervalReadings,
    v: FloatArray,
    i: FloatArray,
    idle: BoolArray,
    service: ServiceConstants,
) -> PhasePower:
    """P, Q and S of each phase, metered values first."""
    s = v * i
    p = np.full_like(s, np.nan)
    q = np.full_like(s, np.nan)
    flags = np.zeros(s.shape, dtype=np.uint16)
    printed = _printed_power_factor(readings)
    read = None
    if printed is not None:
        read = conventions.read_power_factor(
            printed, service.power_factor, readings.p, readings.lead_lag
        )
        p = s * read.magnitude * read.direction
        q = _signed_reactive(
            power.reactive_power_from_power_factor(s, read.magnitude),
            read.sense,
            read.direction,
        )
        flags |= read.flags
    if readings.p is not None or readings.q is not None or readings.s is not None:
        p, q, s, flags = _with_metered(readings, p, q, s, read, flags, service)
    elif printed is None:
        p, q = _shared_from_totals(readings, s, p, q, service)
    blank = idle & np.isnan(p)
    p[blank], q[blank] = 0.0, 0.0
    flags |= _where_flag(blank, Flag.NO_LOAD)
    flags |= _where_flag(np.isnan(q) & ~np.isnan(p), Flag.Q_UNKNOWN)
    return PhasePower(p, q, s, np.bitwise_or.reduce(flags, axis=0))


def _printed_power_factor(readings: IntervalReadings) -> FloatArray | None:
    if readings.pf is not None:
        return readings.pf
    if readings.pf_total is not None:
        return np.repeat(readings.pf_total[None, :], 3, axis=0)
    return None


def _where_flag(mask: BoolArray, flag: Flag) -> npt.NDArray[np.uint16]:
    return mask.astype(np.uint16) * np.uint16(flag)


def _signed_reactive(magnitude: FloatArray, sense: FloatArray, direction: FloatArray) -> FloatArray:
    """Q with its sign. At unity it is zero whatever the sense, known or not."""
    return np.where(magnitude == 0.0, 0.0, magnitude * sense * direction)


def _with_metered(
    readings: IntervalReadings,
    p: FloatArray,
    q: FloatArray,
    s: FloatArray,
    read: conventions.PowerFactorReading | None,
    flags: npt.NDArray[np.uint16],
    service: ServiceConstants,
) -> tuple[FloatArray, FloatArray, FloatArray, npt.NDArray[np.uint16]]:
    """Let metered kW, kvar and kVA of the phases win over V·I·PF.

    Q comes from kvar, else from P tan φ where a power factor is printed, else from
    √(S² − P²) with the assumed sense.
    """
    if readings.s is not None:
        s = np.where(np.isnan(s), readings.s, s)
    if readings.p is not None:
        metered = ~np.isnan(readings.p)
        flags = flags | _where_flag(
            np.abs(readings.p - p) > service.mismatch_fraction * s, Flag.POWER_MISMATCH
        )
        direction = np.where(readings.p < 0, -1.0, 1.0)
        if read is not None:
            size = np.abs(readings.p) * power.tangent_of_power_factor(read.magnitude)
            # At PF 0 tan φ is infinite: V·I is then the only measure of Q.
            size = np.where(read.magnitude > 0, size, s)
            sense = read.sense
        else:
            apparent = s if readings.s is None else np.where(np.isnan(readings.s), s, readings.s)
            size = power.reactive_power_from_apparent(apparent, readings.p)
            assumed = float(service.power_factor.assumed) or np.nan
            sense = np.where(direction > 0, assumed, np.nan)
        p = np.where(metered, readings.p, p)
        q = np.where(metered, _signed_reactive(size, sense, direction), q)
    if readings.q is not None:
        q = np.where(np.isnan(readings.q), q, readings.q)
        known = ~np.isnan(readings.q)
        flags = flags & ~_where_flag(known, Flag.LEAD_LAG_ASSUMED)
    elif read is None:
        flags = flags | _where_flag(np.abs(q) > 0, Flag.LEAD_LAG_ASSUMED)
    s = np.where(np.isnan(s), np.sqrt(p * p + q * q), s)
    return p, q, s, flags


def _total_power(
    readings: IntervalReadings, service: ServiceConstants
) -> tuple[FloatArray, FloatArray] | None:
    """Total P and Q of a meter that prints power for the three phases together."""
    if readings.p_total is None:
        return None
    p = readings.p_total
    if readings.q_total is not None:
        return p, readings.q_total
    if readings.s_total is None:
        return p, np.full_like(p, np.nan)
    size = power.reactive_power_from_apparent(readings.s_total, p)
    assumed = float(service.power_factor.assumed) or np.nan
    sense = np.where(p < 0, np.nan, assumed)
    return p, _signed_reactive(size, sense, np.where(p < 0, -1.0, 1.0))


def _shared_from_totals(
    readings: IntervalReadings,
    s: FloatArray,
    p: FloatArray,
    q: FloatArray,
    service: ServiceConstants,
) -> tuple[FloatArray, FloatArray]:
    """Share metered totals over the phases as their V·I: one angle for all."""
    total = _total_power(readings, service)
    if total is None:
        return p, q
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(s.sum(axis=0) > 0, s / s.sum(axis=0), np.nan)
    return share * total[0], share * total[1]


def _totals(
    readings: IntervalReadings, phases: PhasePower, idle: BoolArray, service: ServiceConstants
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Total P, Q and arithmetic S; totals as metered win over sums of phases."""
    carries = ~idle
    p = power.total_where_carried(phases.p, carries)
    q = power.total_where_carried(phases.q, carries)
    s = power.total_where_carried(phases.s, carries)
    total = _total_power(readings, service)
    if total is not None:
        p = np.where(np.isnan(total[0]), p, total[0])
        metered_q = readings.q_total is not None
        # Q worked out from kVA only fills in: a sum over phases knows its sign better.
        first, second = (total[1], q) if metered_q else (q, total[1])
        q = np.where(np.isnan(first), second, first)
    return p, q, s


def _loaded(
    readings: IntervalReadings,
    i: FloatArray,
    s_vector: FloatArray,
    p_total: FloatArray,
    service: ServiceConstants,
) -> BoolArray:
    """True where the interval as a whole is at or above the light-load floor."""
    if readings.i is not None:
        return np.asarray(np.fmax.reduce(i, axis=0) >= service.floor_a)
    apparent = np.where(np.isnan(s_vector), np.abs(p_total), s_vector)
    equivalent = apparent / (np.sqrt(3.0) * service.nominal_line_v)
    return np.asarray(equivalent >= service.floor_a)


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
    if readings.v_line is not None:  # magnitudes as metered need no angle
        metered = balance.voltage_unbalance_from_lines(readings.v_line)
        vuf = np.where(np.isnan(metered), vuf, metered)
        metered = balance.deviation_from_mean(readings.v_line)
        lvur = np.where(np.isnan(metered), lvur, metered)
    z_delta = impedance.balanced_delta_impedance(v_1, i_1)
    if _current_angle_grade(readings) == "equal":
        z_delta = np.full_like(z_delta, np.nan)
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
