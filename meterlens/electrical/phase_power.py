"""Power of each phase and in total, out of whatever an export has of it.

Metered kW and kvar win over V·I·PF; what one column leaves open another may settle, and
what nothing settles stays unknown. The order of precedence is here and nowhere else.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from meterlens.electrical import power
from meterlens.electrical.conventions import (
    BoolArray,
    Flag,
    FloatArray,
    PowerFactorReading,
    read_power_factor,
)
from meterlens.electrical.readings import IntervalReadings, ServiceConstants

__all__ = ["PhasePower", "TotalPower", "flag_where", "phase_power", "total_power"]

FlagArray = npt.NDArray[np.uint16]


@dataclass(frozen=True)
class PhasePower:
    """Power of each phase.

    Attributes
    ----------
    p, q, s : FloatArray
        Shape (3, n): W, var, VA.
    flags : ndarray of uint16
        Shape (n,): bits of :class:`Flag`.
    """

    p: FloatArray
    q: FloatArray
    s: FloatArray
    flags: FlagArray


@dataclass(frozen=True)
class TotalPower:
    """Power of the service.

    Attributes
    ----------
    p, q, s_vector, s_arithmetic : FloatArray
        Shape (n,): W, var, VA.
    flags : ndarray of uint16
        Shape (n,): bits of :class:`Flag`.
    """

    p: FloatArray
    q: FloatArray
    s_vector: FloatArray
    s_arithmetic: FloatArray
    flags: FlagArray


def flag_where(mask: BoolArray, flag: Flag) -> FlagArray:
    """The flag's bit where the mask is true.

    Parameters
    ----------
    mask : BoolArray
        Any shape, dimensionless.
    flag : Flag

    Returns
    -------
    ndarray of uint16
        The same shape.
    """
    return mask.astype(np.uint16) * np.uint16(flag)


def _first_known(*candidates: FloatArray | None) -> FloatArray:
    """The first value that is known, element by element; None is an absent column."""
    result, *others = (x for x in candidates if x is not None)
    for other in others:
        result = np.where(np.isnan(result), other, result)
    return result


def _known(x: FloatArray | None, like: FloatArray) -> BoolArray:
    """Where a column has a value."""
    return np.zeros(like.shape, dtype=bool) if x is None else ~np.isnan(x)


def _reactive(size: FloatArray, reading: PowerFactorReading) -> tuple[FloatArray, BoolArray]:
    """Q with its sign, zero at unity whatever the sense; and where the sense is assumed."""
    q = np.where(size == 0.0, 0.0, size * reading.sense * reading.direction)
    return q, reading.assumed & (size > 0.0)


def phase_power(
    readings: IntervalReadings,
    v: FloatArray,
    i: FloatArray,
    idle: BoolArray,
    service: ServiceConstants,
) -> PhasePower:
    """P, Q and S of each phase.

    Parameters
    ----------
    readings : IntervalReadings
        What the export has.
    v, i : FloatArray
        Shape (3, n): its voltages, V, and currents, A; NaN where it has none.
    idle : BoolArray
        Shape (3, n): the current is known and under the light-load floor.
    service : ServiceConstants

    Returns
    -------
    PhasePower
        NaN where nothing tells.

    Notes
    -----
    S is V·I, else metered kVA, else √(P² + Q²). P is metered kW, else S·PF. Q is metered
    kvar; else P tan φ where P is metered and PF printed; else S·√(1 − PF²); else
    √(S² − P²). Its sign is that of a metered kvar, of a lead/lag word, of the printed
    power factor where that tells, of the metered total kvar, else the assumption, at
    import only. A power factor left blank at a current under the floor is no load.
    """
    printed = _first_of(readings.pf, _spread(readings.pf_total))
    reading = read_power_factor(
        np.full(v.shape, np.nan) if printed is None else printed,
        service.power_factor,
        _first_of(readings.p, _spread(readings.p_total)),
        _first_of(readings.lead_lag, _spread(readings.lead_lag_total)),
        _spread(readings.q_total),
    )
    s = _first_known(v * i, readings.s)
    by_pf = s * reading.magnitude * reading.direction
    p = _first_known(readings.p, by_pf)
    size, left_over = _reactive_size(readings, reading, s, p)
    worked_out, assumed = _reactive(size, reading)
    q = _first_known(readings.q, worked_out)
    no_kvar = ~_known(readings.q, q)
    blank = np.zeros(v.shape, dtype=bool)
    if printed is not None:
        blank = idle & np.isnan(printed) & ~_known(readings.p, p)
        p = np.where(blank, 0.0, p)
        q = np.where(blank & no_kvar, 0.0, q)
    elif readings.p is None and readings.p_total is not None:
        p, q = _shared(readings, readings.p_total, s, service)
    flags = (
        reading.flags
        | flag_where(assumed & no_kvar & ~blank, Flag.LEAD_LAG_ASSUMED)
        | flag_where(left_over & no_kvar & ~np.isnan(q), Flag.Q_FROM_VOLT_AMPERES)
        | flag_where(blank, Flag.NO_LOAD)
        | flag_where(np.isnan(q) & ~np.isnan(p), Flag.Q_UNKNOWN)
    )
    if readings.p is not None:
        mismatch = np.abs(readings.p - by_pf) > service.mismatch_fraction * s
        flags |= flag_where(mismatch, Flag.POWER_MISMATCH)
    s = np.where(np.isnan(s) & ~blank, power.apparent_power_vector(p, q), s)
    return PhasePower(p, q, s, np.bitwise_or.reduce(flags, axis=0))


def _reactive_size(
    readings: IntervalReadings,
    reading: PowerFactorReading,
    s: FloatArray,
    p: FloatArray,
) -> tuple[FloatArray, BoolArray]:
    """|Q| by power factor, else by what is left of S; and where V·I had to stand for S."""
    pf = reading.magnitude
    size = power.reactive_power_from_power_factor(s, pf)
    if readings.p is not None:
        by_angle = np.abs(p) * power.tangent_of_power_factor(pf)
        size = np.where(~np.isnan(readings.p) & (pf > 0), by_angle, size)
    left_over = np.isnan(size) & ~np.isnan(p)
    if left_over.any():
        apparent = _first_known(readings.s, s)
        size = np.where(left_over, power.reactive_power_from_apparent(apparent, p), size)
    return size, left_over & ~_known(readings.s, s)


def _spread(total: FloatArray | None) -> FloatArray | None:
    """A total's value for each of the phases."""
    return None if total is None else np.repeat(total[None, :], 3, axis=0)


def _first_of(first: FloatArray | None, second: FloatArray | None) -> FloatArray | None:
    """The first column, its holes filled by the second, where there are any at all."""
    if first is None or second is None:
        return second if first is None else first
    return _first_known(first, second)


def _shared(
    readings: IntervalReadings, p_total: FloatArray, s: FloatArray, service: ServiceConstants
) -> tuple[FloatArray, FloatArray]:
    """Share metered totals over the phases as their V·I: one angle for all."""
    total_q, _ = _total_reactive(readings, np.full_like(p_total, np.nan), service)
    whole = s.sum(axis=0)
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(whole > 0, s / whole, np.nan)
    return share * p_total, _first_known(readings.q, share * total_q)


def _total_reactive(
    readings: IntervalReadings, of_phases: FloatArray, service: ServiceConstants
) -> tuple[FloatArray, FlagArray]:
    """Total Q: metered, else by the total's own power factor, else of the phases, else kVA."""
    metered_p = readings.p_total
    if metered_p is None:
        q = _first_known(readings.q_total, of_phases)
        return q, np.zeros(of_phases.shape, dtype=np.uint16)
    unknown = np.full_like(of_phases, np.nan)
    one = read_power_factor(
        unknown if readings.pf_total is None else readings.pf_total,
        service.power_factor,
        metered_p,
        _first_of(
            readings.lead_lag_total,
            None if readings.lead_lag is None else _agreed(readings.lead_lag),
        ),
        readings.q_total,
    )
    by_pf = by_kva = unknown
    pf_assumed = kva_assumed = np.zeros(of_phases.shape, dtype=bool)
    if readings.pf_total is not None:
        tangent = power.tangent_of_power_factor(one.magnitude)
        by_pf, pf_assumed = _reactive(np.abs(metered_p) * tangent, one)
    if readings.s_total is not None:
        size = power.reactive_power_from_apparent(readings.s_total, metered_p)
        by_kva, kva_assumed = _reactive(size, one)
    metered_q = unknown if readings.q_total is None else readings.q_total
    q = _first_known(metered_q, by_pf, of_phases, by_kva)
    open_to_pf = np.isnan(metered_q)
    open_to_kva = open_to_pf & np.isnan(by_pf) & np.isnan(of_phases)
    flags = flag_where(
        (pf_assumed & open_to_pf & ~np.isnan(by_pf)) | (kva_assumed & open_to_kva),
        Flag.LEAD_LAG_ASSUMED,
    )
    return q, flags


def _agreed(lead_lag: FloatArray) -> FloatArray:
    """The word of the three phases where all say the same."""
    a, b, c = lead_lag
    return np.where((a == b) & (b == c), a, np.nan)


def total_power(
    readings: IntervalReadings, phases: PhasePower, idle: BoolArray, service: ServiceConstants
) -> TotalPower:
    """Power of the service: totals as metered, else sums over the phases.

    Parameters
    ----------
    readings : IntervalReadings
    phases : PhasePower
    idle : BoolArray
        Shape (3, n): phases whose gaps spoil no total.
    service : ServiceConstants

    Returns
    -------
    TotalPower
        W, var and VA; NaN where a loaded phase is not known and no total is metered.
    """
    carries = ~idle
    summed = power.total_where_carried(phases.p, carries)
    s = power.total_where_carried(phases.s, carries)
    of_phases = power.total_where_carried(phases.q, carries)
    q, flags = _total_reactive(readings, of_phases, service)
    p = _first_known(readings.p_total, summed)
    if readings.p_total is not None:
        flags = flags | flag_where(
            np.abs(readings.p_total - summed) > service.mismatch_fraction * s,
            Flag.POWER_MISMATCH,
        )
    flags = flags | flag_where(np.isnan(q) & ~np.isnan(p), Flag.Q_UNKNOWN)
    flags |= flag_where(np.isnan(p), Flag.INCOMPLETE)
    s_vector = _first_known(power.apparent_power_vector(p, q), readings.s_total)
    return TotalPower(p, q, s_vector, _first_known(s, readings.s_total), flags)
