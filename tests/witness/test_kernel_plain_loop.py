"""The kernel against a plain loop in complex numbers, one interval and one phase at a time.

The loop is written from the definitions, not from the kernel: phasors at nominal angles,
S = V·I*, Fortescue's sums, the standard's apparent powers, ohms as V/I.
"""

from __future__ import annotations

import cmath
import math
from dataclasses import replace

import numpy as np
import pytest

from meterlens.electrical.conventions import PowerFactorSense
from meterlens.electrical.interval import (
    IntervalQuantities,
    IntervalReadings,
    ServiceConstants,
    derive_intervals,
)

NAN = math.nan
FLOOR_A = 8.0
COUNT = 400
SERVICE = ServiceConstants("abc", 400.0, FLOOR_A, PowerFactorSense("sign-is-power-flow"))
PER_PHASE = ("p", "q", "s", "pf", "r_wye", "x_wye")
Row = dict[str, float]


def plain_phase(v: float, i: float, pf: float, word: float) -> Row:
    """One phase: the printed power factor signed as P, the word +1 lagging, -1 leading."""
    s = v * i
    idle = i < FLOOR_A
    if math.isnan(pf) and idle:
        p = q = 0.0
    else:
        phi = math.acos(abs(pf))
        p = s * pf
        q = 0.0 * s if abs(pf) == 1.0 else word * math.copysign(1.0, p) * s * math.sin(phi)
    return plain_ratios(v, i, p, q, s)


def plain_metered_phase(v: float, i: float, p: float, q: float) -> Row:
    return plain_ratios(v, i, p, q, v * i)


def plain_ratios(v: float, i: float, p: float, q: float, s: float) -> Row:
    row = {"p": p, "q": q, "s": s, "pf": NAN, "r_wye": NAN, "x_wye": NAN}
    if i >= FLOOR_A and s > 0:
        row["pf"] = p / s if abs(p) <= 1.005 * s else NAN
        z = cmath.rect(v / i, math.atan2(q, p)) if not math.isnan(q) else complex(NAN, NAN)
        row |= {"r_wye": z.real, "x_wye": z.imag}
    return row


def plain_total(phases: list[Row], i: list[float], name: str) -> float:
    """Null where a phase that carries current lacks the value."""
    total = 0.0
    for k, phase in enumerate(phases):
        if math.isnan(phase[name]):
            if not i[k] < FLOOR_A:
                return NAN
        else:
            total += phase[name]
    return total


def farthest(x: list[float]) -> float:
    mean = sum(x) / 3.0
    return max(abs(value - mean) for value in x) / mean if mean > 0 else NAN


def fortescue(x: list[complex], sequence: str) -> tuple[complex, complex, complex]:
    """Zero, own-sequence and counter-sequence components."""
    a = cmath.rect(1.0, math.radians(120.0 if sequence == "abc" else -120.0))
    return (
        (x[0] + x[1] + x[2]) / 3.0,
        (x[0] + a * x[1] + a * a * x[2]) / 3.0,
        (x[0] + a * a * x[1] + a * x[2]) / 3.0,
    )


def plain_interval(
    phases: list[Row], v: list[float], i: list[float], v_line: list[float] | None, sequence: str
) -> Row:
    """Totals, phasors and imbalance of one interval from its three phases."""
    row = {"p_total": plain_total(phases, i, "p"), "q_total": plain_total(phases, i, "q")}
    row["s_arithmetic"] = plain_total(phases, i, "s")
    row["s_vector"] = math.hypot(row["p_total"], row["q_total"])
    if math.isnan(row["p_total"]) or math.isnan(row["q_total"]):
        row["s_vector"] = NAN
    lag = math.radians(-120.0 if sequence == "abc" else 120.0)
    voltage = [cmath.rect(v[k], k * lag) for k in range(3)]
    current = [
        cmath.rect(i[k], k * lag - math.atan2(phases[k]["q"], phases[k]["p"])) for k in range(3)
    ]
    _, v_1, v_2 = fortescue(voltage, sequence)
    i_0, i_1, i_2 = fortescue(current, sequence)
    row["i_neutral"] = abs(sum(current))
    sides = [abs(voltage[k] - voltage[(k + 1) % 3]) for k in range(3)]
    i_e = math.sqrt((sum(x * x for x in i) + row["i_neutral"] ** 2) / 3.0)
    v_e = math.sqrt((3.0 * sum(x * x for x in v) + sum(x * x for x in sides)) / 18.0)
    row["s_effective"] = 3.0 * v_e * i_e
    loaded = any(x >= FLOOR_A for x in i)
    ratios = {
        f"pf_{kind}": row["p_total"] / row[f"s_{kind}"] if row[f"s_{kind}"] else NAN
        for kind in ("vector", "arithmetic", "effective")
    }
    z = 3.0 * v_1 / i_1 if i_1 else complex(NAN, NAN)
    ratios |= {"r_delta": z.real, "x_delta": z.imag}
    ratios |= {"lvur": farthest(sides), "pvur": farthest(v), "current_unbalance": farthest(i)}
    ratios |= {"vuf": abs(v_2) / abs(v_1)}
    ratios |= {"iuf2": abs(i_2) / abs(i_1), "iuf0": abs(i_0) / abs(i_1)} if i_1 else {}
    if v_line is not None:
        ratios |= {"lvur": farthest(v_line), "vuf": plain_beta(v_line)}
    return row | {name: value if loaded else NAN for name, value in ratios.items()}


def plain_beta(v_line: list[float]) -> float:
    """The standard's β form, whose digits suffice far from balance."""
    beta = sum(x**4 for x in v_line) / sum(x * x for x in v_line) ** 2
    root = math.sqrt(3.0 - 6.0 * beta)
    return math.sqrt((1.0 - root) / (1.0 + root))


def random_readings(seed: int) -> IntervalReadings:
    """Unbalanced, importing and exporting, with idle phases and blank power factors."""
    rng = np.random.default_rng(seed)
    shape = (3, COUNT)
    i = rng.uniform(FLOOR_A, 300.0, shape)
    light = rng.random(shape) < 0.15
    i[light] = rng.uniform(0.0, FLOOR_A, shape)[light]
    i[:, -20:] = rng.uniform(0.0, FLOOR_A, (3, 20))
    pf = rng.uniform(0.05, 0.999, shape) * rng.choice([1.0, 1.0, 1.0, -1.0], shape)
    pf[rng.random(shape) < 0.08] = 1.0
    pf[rng.random(shape) < 0.08] = NAN
    v = rng.uniform(190.0, 265.0, shape)
    v[0, ::37] = NAN
    i[1, ::41] = NAN
    pf[np.isnan(v)] = NAN  # no meter prints a power factor without a voltage
    i[np.isnan(v)] = 50.0
    return IntervalReadings(v=v, i=i, pf=pf, lead_lag=rng.choice([1.0, -1.0], shape))


def plain_rows(readings: IntervalReadings, sequence: str) -> list[tuple[list[Row], Row]]:
    assert readings.v is not None
    assert readings.i is not None
    rows = []
    for n in range(readings.count):
        v, i = readings.v[:, n].tolist(), readings.i[:, n].tolist()
        if readings.p is not None and readings.q is not None:
            p, q = readings.p[:, n].tolist(), readings.q[:, n].tolist()
            phases = [plain_metered_phase(v[k], i[k], p[k], q[k]) for k in range(3)]
        else:
            assert readings.pf is not None
            assert readings.lead_lag is not None
            pf, word = readings.pf[:, n].tolist(), readings.lead_lag[:, n].tolist()
            phases = [plain_phase(v[k], i[k], pf[k], word[k]) for k in range(3)]
        v_line = None if readings.v_line is None else readings.v_line[:, n].tolist()
        rows.append((phases, plain_interval(phases, v, i, v_line, sequence)))
    return rows


def compare(readings: IntervalReadings, service: ServiceConstants) -> IntervalQuantities:
    """Every output, within 1e-12 of the size of what it was subtracted from."""
    out = derive_intervals(readings, service)
    rows = plain_rows(readings, service.sequence)
    for name in PER_PHASE:
        expected = np.array([[phase[name] for phase in phases] for phases, _ in rows]).T
        alike(getattr(out, name), expected, phase_scale(out, name), name)
    for name in rows[0][1]:
        expected = np.array([row.get(name, NAN) for _, row in rows])
        alike(getattr(out, name), expected, total_scale(out, readings, name), name)
    return out


def phase_scale(out: IntervalQuantities, name: str) -> np.ndarray:
    if name in ("p", "q", "s"):
        return out.s
    return np.ones_like(out.s) if name == "pf" else np.hypot(out.r_wye, out.x_wye)


def total_scale(out: IntervalQuantities, readings: IntervalReadings, name: str) -> np.ndarray:
    assert readings.i is not None
    # |I1| far under the currents loses digits in any arithmetic: ratios grow by it.
    ill = 1.0 + np.nan_to_num(out.iuf2 + out.iuf0)
    if name in ("p_total", "q_total", "s_vector", "s_arithmetic", "s_effective"):
        return np.nansum(np.abs(out.s), axis=0)
    if name == "i_neutral":
        return np.nansum(readings.i, axis=0)
    if name in ("r_delta", "x_delta"):
        return ill * np.hypot(out.r_delta, out.x_delta)
    if name in ("iuf2", "iuf0"):
        return ill * ill
    # P and Q that nearly cancel leave a vector PF of few digits.
    shrunk = np.nan_to_num(np.nansum(out.s, axis=0) / out.s_vector, posinf=1.0)
    return 1.0 + shrunk if name == "pf_vector" else np.ones_like(ill)


def alike(ours: np.ndarray, theirs: np.ndarray, scale: np.ndarray, name: str) -> None:
    np.testing.assert_array_equal(np.isnan(ours), np.isnan(theirs), err_msg=name)
    known = ~np.isnan(theirs)
    assert known.sum() > 100, name
    apart = np.abs(ours - theirs)[known]
    assert np.all(apart <= 1e-12 * scale[known]), f"{name}: {(apart / scale[known]).max():.1e}"


@pytest.mark.parametrize("sequence", ["abc", "acb"])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_voltage_current_and_power_factor(seed: int, sequence: str) -> None:
    compare(random_readings(seed), replace(SERVICE, sequence=sequence))


@pytest.mark.parametrize("seed", [4, 5])
def test_metered_kw_and_kvar(seed: int) -> None:
    readings = random_readings(seed)
    assert readings.v is not None
    assert readings.i is not None
    rng = np.random.default_rng(seed)
    phi = rng.uniform(-np.pi, np.pi, (3, COUNT))
    v = np.where(np.isnan(readings.v), 230.0, readings.v)
    i = np.where(np.isnan(readings.i), 60.0, readings.i)
    metered = IntervalReadings(v=v, i=i, p=v * i * np.cos(phi), q=v * i * np.sin(phi))
    compare(metered, replace(SERVICE, power_factor=PowerFactorSense("from-power")))


def test_line_voltages_as_metered() -> None:
    readings = random_readings(6)
    rng = np.random.default_rng(6)
    v_line = rng.uniform(350.0, 450.0, (3, COUNT))
    out = compare(replace(readings, v_line=v_line), SERVICE)
    assert out.voltage_angle_grade == "nominal"
