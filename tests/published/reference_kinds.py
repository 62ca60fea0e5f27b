"""The kinds of reference case: the program's answer, and another way to the same numbers.

``PROGRAM`` calls the kernel; ``RECOMPUTED`` never does. It goes by phasors in complex
numbers, by the law of cosines, or by fifty digits.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Iterator
from typing import Any

import numpy as np
from mpmath import mp, mpf

from meterlens.electrical import balance, phasors, power
from meterlens.electrical.conventions import PowerFactorSense
from meterlens.electrical.interval import IntervalReadings, ServiceConstants, derive_intervals

Inputs = dict[str, Any]
Values = dict[str, float]
Route = Callable[[Inputs], Values]

TURN = cmath.rect(1.0, 2.0 * math.pi / 3.0)  # a = 1∠120°
SWEEP = 2000  # steps over the line voltages of one deviation


def _column(numbers: list[float]) -> np.ndarray:
    return np.array(numbers, dtype=float)[:, None]


def _percent(fraction: np.ndarray) -> float:
    return 100.0 * float(fraction[0])


def _in_thousands(values: Values) -> Values:
    """The same powers in kW, kvar and kVA."""
    return values | {
        f"{name.removesuffix(unit)}k{unit}": value / 1000.0
        for name, value in values.items()
        for unit in ("w", "var", "va")
        if name.endswith(f"_{unit}")
    }


# --- line voltages -------------------------------------------------------------------


def _lines_program(inputs: Inputs) -> Values:
    sides = _column(inputs["v_line_v"])
    lvur = balance.deviation_from_mean(sides)
    return {
        "lvur_percent": _percent(lvur),
        "vuf_percent": _percent(balance.voltage_unbalance_from_lines(sides)),
        "mean_v": float(sides.mean()),
        "largest_deviation_v": float(lvur[0]) * float(sides.mean()),
    }


def _unbalance_by_cosines(v_ab: float, v_bc: float, v_ca: float) -> float:
    """|V₂|/|V₁| of the corners of the triangle that the three magnitudes close."""
    at_a = math.acos((v_ab**2 + v_ca**2 - v_bc**2) / (2.0 * v_ab * v_ca))
    a, b, c = 0j, complex(-v_ab), -v_ca * cmath.exp(-1j * at_a)
    positive, negative = a + TURN * b + TURN**2 * c, a + TURN**2 * b + TURN * c
    return min(abs(positive), abs(negative)) / max(abs(positive), abs(negative))


def _lines_recomputed(inputs: Inputs) -> Values:
    sides = inputs["v_line_v"]
    with mp.workdps(50):
        exact = [mpf(x) for x in sides]
        mean = sum(exact) / 3
        farthest = max(abs(x - mean) for x in exact)
        beta = sum(x**4 for x in exact) / sum(x**2 for x in exact) ** 2
        approximation = 82 * mp.sqrt(sum((x - mean) ** 2 for x in exact)) / mean
        return {
            "mean_v": float(mean),
            "largest_deviation_v": float(farthest),
            "lvur_percent": float(100 * farthest / mean),
            "beta": float(beta),
            "approximation_82_percent": float(approximation),
            "vuf_percent": 100.0 * _unbalance_by_cosines(*sides),
        }


def _sets_of_deviation(share: float) -> Iterator[tuple[float, float, float]]:
    """Line voltages about a mean of 1 whose largest deviation is `share`."""
    for sign in (1.0, -1.0):
        for step in range(SWEEP + 1):
            apart = share / 2.0 * step / SWEEP
            rest = 1.0 - sign * share / 2.0
            yield 1.0 + sign * share, rest + apart, rest - apart


def _range_program(inputs: Inputs) -> Values:
    sets = np.array(list(_sets_of_deviation(inputs["lvur_percent"] / 100.0))).T
    assert np.allclose(100.0 * balance.deviation_from_mean(sets), inputs["lvur_percent"])
    percent = 100.0 * balance.voltage_unbalance_from_lines(sets)
    return {"vuf_least_percent": float(percent.min()), "vuf_most_percent": float(percent.max())}


def _range_recomputed(inputs: Inputs) -> Values:
    sets = _sets_of_deviation(inputs["lvur_percent"] / 100.0)
    percent = [100.0 * _unbalance_by_cosines(*sides) for sides in sets]
    return {"vuf_least_percent": min(percent), "vuf_most_percent": max(percent)}


# --- powers of an interval -----------------------------------------------------------


def _interval_program(inputs: Inputs) -> Values:
    lead_lag = inputs.get("lead_lag", [math.nan] * 3)
    out = derive_intervals(
        IntervalReadings(
            v=_column(inputs["v_v"]),
            i=_column(inputs["i_a"]),
            pf=_column(inputs["pf"]),
            lead_lag=_column(lead_lag),
        ),
        ServiceConstants("abc", 400.0, 1.0, PowerFactorSense("sign-is-power-flow", assumed=1)),
    )
    values = {
        "p_w": out.p_total,
        "q_var": out.q_total,
        "s_arithmetic_va": out.s_arithmetic,
        "s_vector_va": out.s_vector,
        "s_effective_va": out.s_effective,
        "pf_arithmetic": out.pf_arithmetic,
        "pf_vector": out.pf_vector,
        "pf_effective": out.pf_effective,
        "i_neutral_a": out.i_neutral,
    } | {f"pf_{phase}": out.pf[k] for k, phase in enumerate("abc")}
    return _in_thousands({name: float(value[0]) for name, value in values.items()})


def _interval_recomputed(inputs: Inputs) -> Values:
    """Currents as phasors first, powers from them: S = V·I*."""
    lead_lag = inputs.get("lead_lag", [math.nan] * 3)
    voltages, currents = [], []
    for k in range(3):
        v = inputs["v_v"][k] * TURN ** (-k)
        i, pf, word = inputs["i_a"][k], inputs["pf"][k], lead_lag[k]
        phi = 0.0 if math.isnan(pf) else math.acos(abs(pf))
        phi *= -1.0 if word < 0 else 1.0
        phi += math.pi if pf < 0 else 0.0
        voltages.append(v)
        currents.append(i * cmath.exp(1j * (cmath.phase(v) - phi)))
    total = sum(v * i.conjugate() for v, i in zip(voltages, currents, strict=True))
    arithmetic, effective = _apparent(voltages, currents)
    values = {
        "p_w": total.real,
        "q_var": total.imag,
        "s_vector_va": abs(total),
        "s_arithmetic_va": arithmetic,
        "s_effective_va": effective,
        "pf_vector": total.real / abs(total),
        "pf_arithmetic": total.real / arithmetic,
        "pf_effective": total.real / effective,
        "i_neutral_a": abs(sum(currents)),
    }
    for phase, v, i in zip("abc", voltages, currents, strict=True):
        s = v * i.conjugate()
        values[f"pf_{phase}"] = s.real / abs(s) if s else math.nan
    return _in_thousands(values)


def _apparent(voltages: list[complex], currents: list[complex]) -> tuple[float, float]:
    """Arithmetic and effective apparent power, by the sequence components of the latter.

    V_e² = V₊² + V₋² + V₀²/2 and I_e² = I₊² + I₋² + 4 I₀² are the standard's own other form.
    """
    arithmetic = sum(abs(v) * abs(i) for v, i in zip(voltages, currents, strict=True))
    v_0, v_1, v_2 = (abs(x) for x in _components(voltages))
    i_0, i_1, i_2 = (abs(x) for x in _components(currents))
    v_e = math.sqrt(v_1**2 + v_2**2 + v_0**2 / 2.0)
    i_e = math.sqrt(i_1**2 + i_2**2 + 4.0 * i_0**2)
    return arithmetic, 3.0 * v_e * i_e


def _polar(magnitude: list[float], degrees: list[float]) -> list[complex]:
    return [cmath.rect(m, math.radians(d)) for m, d in zip(magnitude, degrees, strict=True)]


def _apparent_program(inputs: Inputs) -> Values:
    v = np.array(_polar(inputs["v_v"], inputs["v_deg"]))[:, None]
    i = np.array(_polar(inputs["i_a"], inputs["i_deg"]))[:, None]
    effective = power.apparent_power_effective(
        np.abs(v), phasors.line_voltages(v), np.abs(i), np.abs(i.sum(axis=0))
    )
    carries = np.ones(v.shape, dtype=bool)
    arithmetic = power.total_where_carried(np.abs(v) * np.abs(i), carries)
    return {
        "s_arithmetic_kva": float(arithmetic[0]) / 1000.0,
        "s_effective_kva": float(effective[0]) / 1000.0,
    }


def _apparent_recomputed(inputs: Inputs) -> Values:
    arithmetic, effective = _apparent(
        _polar(inputs["v_v"], inputs["v_deg"]), _polar(inputs["i_a"], inputs["i_deg"])
    )
    return {"s_arithmetic_kva": arithmetic / 1000.0, "s_effective_kva": effective / 1000.0}


# --- sequence components -------------------------------------------------------------


def _components(x: list[complex]) -> tuple[complex, complex, complex]:
    a, b, c = x
    return (
        (a + b + c) / 3.0,
        (a + TURN * b + TURN**2 * c) / 3.0,
        (a + TURN**2 * b + TURN * c) / 3.0,
    )


def _named(zero: complex, positive: complex, negative: complex) -> Values:
    named = {"zero": zero, "positive": positive, "negative": negative, "neutral": 3.0 * zero}
    values = {name: abs(x) for name, x in named.items()}
    return values | {f"{name}_deg": math.degrees(cmath.phase(x)) for name, x in named.items()}


def _sequence_program(inputs: Inputs) -> Values:
    x = np.array(_polar(inputs["magnitude"], inputs["angle_deg"]))[:, None]
    zero, positive, negative = (complex(part[0]) for part in phasors.sequence_components(x))
    return _named(zero, positive, negative)


def _sequence_recomputed(inputs: Inputs) -> Values:
    return _named(*_components(_polar(inputs["magnitude"], inputs["angle_deg"])))


# --- tangent and power factor --------------------------------------------------------


def _tan_program(inputs: Inputs) -> Values:
    out = derive_intervals(
        IntervalReadings(p_total=np.array([1e5]), q_total=np.array([1e5 * inputs["tan_phi"]])),
        ServiceConstants("abc", 400.0, 1.0, PowerFactorSense("from-power")),
    )
    return {"pf": float(out.pf_vector[0])}


def _tan_recomputed(inputs: Inputs) -> Values:
    return {"pf": math.cos(math.atan(inputs["tan_phi"]))}


def _pf_program(inputs: Inputs) -> Values:
    return {"tan_phi": float(power.tangent_of_power_factor(np.array([inputs["pf"]]))[0])}


def _pf_recomputed(inputs: Inputs) -> Values:
    return {"tan_phi": math.tan(math.acos(inputs["pf"]))}


PROGRAM: dict[str, Route] = {
    "line-voltages": _lines_program,
    "unbalance-range": _range_program,
    "interval": _interval_program,
    "apparent-powers": _apparent_program,
    "sequence-components": _sequence_program,
    "tan-phi": _tan_program,
    "power-factor": _pf_program,
}
RECOMPUTED: dict[str, Route] = {
    "line-voltages": _lines_recomputed,
    "unbalance-range": _range_recomputed,
    "interval": _interval_recomputed,
    "apparent-powers": _apparent_recomputed,
    "sequence-components": _sequence_recomputed,
    "tan-phi": _tan_recomputed,
    "power-factor": _pf_recomputed,
}
