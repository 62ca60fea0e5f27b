"""Derived values of one interval of a four-wire wye, from the definitions, in complex numbers.

Voltage angles are nominal (L-N magnitudes only, 120° apart), current angles per phase.
"""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass

from plain_reader import PHASES, ExportMap, Row

TURN = cmath.rect(1.0, 2.0 * math.pi / 3.0)  # the operator a = 1∠120°
NOMINAL_RAD = (0.0, -2.0 * math.pi / 3.0, 2.0 * math.pi / 3.0)
Values = dict[str, float | None]


@dataclass(frozen=True)
class Service:
    """The settings of the service under review (V, A, minutes, fractions)."""

    nominal_voltage_v: float = 400.0
    rating_a: float = 1600.0
    light_load_fraction: float = 0.02
    target_pf: float = 0.95
    voltage_band_pu: tuple[float, float] = (0.90, 1.10)
    demand_window_min: int = 15
    demand_kind: str = "block"

    @property
    def floor_a(self) -> float:
        """Light-load floor in ampere: a current below it carries no PF."""
        return self.light_load_fraction * self.rating_a


@dataclass(frozen=True)
class Phase:
    """One phase of one interval; power in kVA as P + jQ, None where unknown."""

    v: float | None
    i: float | None
    s_kva: float | None
    p_kw: float | None
    q_kvar: float | None
    light: bool

    def current_phasor(self, nominal_rad: float) -> complex | None:
        """Current in ampere against the nominal voltage angles."""
        if self.i is None or self.p_kw is None or self.q_kvar is None:
            return None
        phi = math.atan2(self.q_kvar, self.p_kw)
        return cmath.rect(self.i, nominal_rad - phi)


def number(row: Row, key: str) -> float | None:
    """A numeric reading of a row, None where it is missing."""
    value = row.get(key)
    return value if isinstance(value, float) else None


def signed_pf(row: Row, k: str, export_map: ExportMap) -> tuple[float, float | None] | None:
    """PF with the sign of P, and q (+1 lagging, −1 leading, None unknown)."""
    printed = number(row, f"pf_{k}")
    if printed is None:
        return None
    fraction = printed / (100.0 if export_map.pf_percent else 1.0)
    fraction = max(-1.0, min(1.0, fraction))
    word = row.get(f"lead_lag_{k}")
    assumed: float | None = 1.0 if export_map.assume == "lagging" else -1.0
    if isinstance(word, str):
        assumed = 1.0 if word.lower().startswith("lag") else -1.0
    if export_map.pf_convention == "sign-is-power-flow":
        if fraction < 0.0 and not isinstance(word, str):
            assumed = None
        return fraction, assumed
    if export_map.pf_convention == "sign-is-lead-lag":
        lagging = (fraction < 0.0) == (export_map.lagging_sign == "negative")
        return abs(fraction), 1.0 if lagging else -1.0
    return abs(fraction), assumed


def phase_of(row: Row, k: str, export_map: ExportMap, service: Service) -> Phase:
    """P, Q and S of one phase."""
    v, i = number(row, f"v_{k}"), number(row, f"i_{k}")
    light = i is not None and i < service.floor_a
    if v is None or i is None:
        return Phase(v, i, None, None, None, light)
    s_kva = v * i / 1000.0
    factor = signed_pf(row, k, export_map)
    if factor is None:
        nothing = 0.0 if light else None
        return Phase(v, i, s_kva, nothing, nothing, light)
    pf, q_sign = factor
    p_kw = s_kva * pf
    sign_of_p = math.copysign(1.0, pf)
    q_kvar = None
    if q_sign is not None:
        q_kvar = q_sign * sign_of_p * math.sqrt(max(0.0, s_kva * s_kva - p_kw * p_kw))
    return Phase(v, i, s_kva, p_kw, q_kvar, light)


def derive(row: Row, export_map: ExportMap, service: Service) -> Values:
    """Every derived column of one interval.

    Parameters
    ----------
    row : dict
        Readings by key (V, A, PF as printed).
    export_map : ExportMap
        What the PF column means.
    service : Service
        Rating and limits.

    Returns
    -------
    dict
        Column name to value; None where it cannot be known.
    """
    phases = [phase_of(row, k, export_map, service) for k in PHASES]
    out: Values = {"i_n_metered_a": number(row, "i_n")}
    for k, phase in zip(PHASES, phases, strict=True):
        out |= phase_columns(row, k, phase)
    loaded = max((x.i for x in phases if x.i is not None), default=0.0) >= service.floor_a
    out |= totals(phases)
    out |= phasor_columns(phases)
    out |= magnitude_columns(phases)
    for name in ("vector", "arithmetic", "effective"):
        out[f"pf_{name}"] = ratio(out["p_kw"], out[f"s_{name}_kva"])
    if not loaded:
        for name in ("pf_vector", "pf_arithmetic", "pf_effective", "r_delta_ohm", "x_delta_ohm"):
            out[name] = None
        for name in ("vuf", "lvur", "pvur", "iuf2", "iuf0", "current_unbalance"):
            out[name] = None
    return out


def phase_columns(row: Row, k: str, phase: Phase) -> Values:
    """The columns of one phase (kW, kvar, kVA, ohm)."""
    out: Values = {
        f"v_{k}": phase.v,
        f"i_{k}": phase.i,
        f"pf_exported_{k}": number(row, f"pf_{k}"),
        f"p_{k}_kw": phase.p_kw,
        f"q_{k}_kvar": phase.q_kvar,
        f"s_{k}_kva": phase.s_kva,
        f"pf_{k}": None if phase.light else ratio(phase.p_kw, phase.s_kva),
        f"r_wye_{k}_ohm": None,
        f"x_wye_{k}_ohm": None,
    }
    current = phase.current_phasor(0.0)
    if current and phase.v is not None and not phase.light:
        impedance = phase.v / current
        out[f"r_wye_{k}_ohm"], out[f"x_wye_{k}_ohm"] = impedance.real, impedance.imag
    return out


def totals(phases: list[Phase]) -> Values:
    """Sums over the phases; None where a phase that carries current lacks the value."""

    def total(values: list[float | None]) -> float | None:
        known = [value for value in values if value is not None]
        return math.fsum(known) if len(known) == len(values) else None

    p = total([x.p_kw for x in phases])
    q = total([x.q_kvar for x in phases])
    return {
        "p_kw": p,
        "q_kvar": q,
        "s_vector_kva": None if p is None or q is None else abs(complex(p, q)),
        "s_arithmetic_kva": total([x.s_kva for x in phases]),
    }


def phasor_columns(phases: list[Phase]) -> Values:
    """What needs angles: sequence parts, neutral, effective kVA, balanced delta."""
    names = ("s_effective_kva", "r_delta_ohm", "x_delta_ohm", "vuf", "lvur", "iuf2", "iuf0")
    out: Values = dict.fromkeys((*names, "i_n_a"))
    volts = [cmath.rect(x.v, th) for x, th in zip(phases, NOMINAL_RAD, strict=True) if x.v]
    amps = [x.current_phasor(th) for x, th in zip(phases, NOMINAL_RAD, strict=True)]
    known = [current for current in amps if current is not None]
    if len(volts) == 3:
        lines = [abs(volts[k] - volts[(k + 1) % 3]) for k in range(3)]
        out["lvur"] = largest_deviation(lines)
        out["vuf"] = abs(sequence(volts)[2]) / abs(sequence(volts)[1])
    if len(known) < 3:
        return out
    neutral = abs(sum(known))
    out["i_n_a"] = neutral
    zero, positive, negative = sequence(known)
    if abs(positive) > 0.0:
        out["iuf2"] = abs(negative) / abs(positive)
        out["iuf0"] = abs(zero) / abs(positive)
    if len(volts) == 3:
        squares = 3.0 * sum(abs(v) ** 2 for v in volts) + sum(d * d for d in lines)
        i_e = math.sqrt((sum(abs(i) ** 2 for i in known) + neutral**2) / 3.0)
        out["s_effective_kva"] = 3.0 * math.sqrt(squares / 18.0) * i_e / 1000.0
        if abs(positive) > 0.0:
            delta = 3.0 * sequence(volts)[1] / positive
            out["r_delta_ohm"], out["x_delta_ohm"] = delta.real, delta.imag
    return out


def magnitude_columns(phases: list[Phase]) -> Values:
    """Imbalance of plain magnitudes."""
    volts = [x.v for x in phases if x.v is not None]
    amps = [x.i for x in phases if x.i is not None]
    return {
        "pvur": largest_deviation(volts) if len(volts) == 3 else None,
        "current_unbalance": largest_deviation(amps) if len(amps) == 3 else None,
    }


def sequence(x: list[complex]) -> tuple[complex, complex, complex]:
    """Zero, positive and negative sequence parts."""
    zero = (x[0] + x[1] + x[2]) / 3.0
    positive = (x[0] + TURN * x[1] + TURN * TURN * x[2]) / 3.0
    negative = (x[0] + TURN * TURN * x[1] + TURN * x[2]) / 3.0
    return zero, positive, negative


def largest_deviation(values: list[float]) -> float | None:
    """Largest deviation from the mean, over the mean."""
    mean = math.fsum(values) / len(values)
    return None if mean == 0.0 else max(abs(value - mean) for value in values) / mean


def ratio(above: float | None, below: float | None) -> float | None:
    """A quotient that is None where it has no meaning."""
    return None if above is None or below is None or below == 0.0 else above / below
