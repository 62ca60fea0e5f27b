"""The four services' loads, built up as powers and admittances."""

from __future__ import annotations

import numpy as np

from generator.circuit import (
    NOMINAL_LN_V,
    Floats,
    Load,
    Phasors,
    Record,
    Source,
    capacitor_siemens,
    solve,
    source_voltages,
)
from generator.clock import Grid, by_day, grid
from generator.noise import Noise
from generator.planted import PLANTED, window

FIRST, LAST = "2026-10-01 00:00", "2026-12-01 00:00"


def _supply(times: Grid, noise: Noise, level: float, fixed: tuple[float, float, float]) -> Phasors:
    """Source voltages: low in the evening, drifting, the phases a few tenths % apart."""
    daily = by_day(
        times,
        [(0, 0.004), (6, 0.003), (9, -0.004), (13, -0.002), (19.5, -0.009), (24, 0.004)],
        [(0, 0.004), (9, 0.001), (19.5, -0.006), (24, 0.005)],
        [(0, 0.005), (9, 0.004), (19.5, -0.005), (24, 0.004)],
    )
    memory = 0.93 ** (times.interval_min / 15)
    common = level + daily + 0.003 * noise.wander(len(times), memory)
    each = np.stack([phase + 0.0006 * noise.wander(len(times), memory) for phase in fixed])
    return source_voltages(common, each)


def _shared(
    kva: Phasors, shares: tuple[float, float, float], noise: Noise, spread: float
) -> Phasors:
    """Spread a service's single-phase load over its phases, VA each.

    Active and reactive power wander apart, so that no phase's power factor stands still.
    """
    each = []
    for share in shares:
        active = kva.real * (1.0 + spread * noise.wander(kva.size, 0.8))
        reactive = kva.imag * (1.0 + 0.05 * noise.wander(kva.size, 0.7))
        each.append(share * 1000.0 * (active + 1j * reactive))
    return np.stack(each)


def _no_admittance(count: int) -> Phasors:
    return np.zeros((3, count), dtype=np.complex128)


def plant() -> Record:
    """Induction motors in two and a half shifts, corrected by an automatic bank."""
    times, noise = grid(FIRST, LAST, 15), Noise(4101)
    rhythm = by_day(
        times,
        [(0, 0.52), (5.75, 0.50), (6.25, 0.93), (9, 1.0), (11.9, 0.98), (12.1, 0.76), (12.7, 0.76),
         (13, 1.0), (17.9, 0.92), (18.4, 0.72), (18.9, 0.90), (21.75, 0.86),
         (22.25, 0.55), (24, 0.52)],
        [(0, 0.50), (5.75, 0.46), (6.25, 0.78), (9.5, 0.80), (13.7, 0.74), (14.3, 0.24),
         (24, 0.17)],
        [(0, 0.17), (9, 0.15), (18, 0.16), (22, 0.20), (23.5, 0.34), (24, 0.50)],
    )  # fmt: skip
    drift = 1.0 + 0.045 * noise.wander(len(times), 0.85) + 0.015 * noise.bell(len(times))
    motors_kw = 310.0 * rhythm * drift
    starts = noise.uniform(len(times)) < 0.04 * rhythm
    motors_kw[starts] += 22.0
    motors_kvar = 30.0 + 0.62 * motors_kw + 9.0 * starts
    plain_kw = 18.0 + 26.0 * rhythm * (1.0 + 0.05 * noise.wander(len(times), 0.9))
    short_kvar = motors_kvar - 0.20 * (motors_kw + plain_kw)
    steps = np.clip(np.ceil(short_kvar / 25.0), 0, 8)
    steps[window(times, "plant-bank-out")] = 0.0
    supply = _supply(times, noise, 1.028, (1.0040, 0.9975, 0.9985))
    tilt = window(times, "plant-imbalance")
    supply[0, tilt] *= 0.948
    supply[2, tilt] *= 1.042
    plain = np.asarray(plain_kw * (1 + 0.12j), dtype=np.complex128)
    load = Load(
        power=_shared(plain, (0.42, 0.29, 0.29), noise, 0.03),
        admittance=capacitor_siemens(25.0 * steps),
        motors=np.asarray((motors_kw + 1j * motors_kvar) * 1000.0),
    )
    return solve(times, supply, load, Source(0.004 + 0.012j, 0.004 + 0.006j), 800.0)


def office() -> Record:
    """Single-phase lighting and electronics, air handling by day, a timed fixed bank."""
    times, noise = grid(FIRST, LAST, 15), Noise(4202)
    desks = by_day(
        times,
        [(0, 0.04), (6, 0.05), (7, 0.18), (8.75, 0.86), (10.5, 1.0), (12.4, 0.95), (13, 0.78),
         (13.75, 0.95), (16.5, 0.90), (18, 0.45), (19.75, 0.12), (20.25, 0.05), (24, 0.04)],
        [(0, 0.04), (9, 0.06), (11, 0.10), (14, 0.07), (24, 0.04)],
        [(0, 0.04), (12, 0.05), (24, 0.04)],
    )  # fmt: skip
    season = np.linspace(0.0, 1.0, len(times))
    wander = 1.0 + 0.05 * noise.wander(len(times), 0.8) + 0.01 * noise.bell(len(times))
    always_kw = 19.0 + 0.6 * noise.wander(len(times), 0.9)
    plain_kw = always_kw + (70.0 + 8.0 * season) * desks * wander
    plain_kvar = 1.2 + 0.09 * plain_kw
    running = (times.weekday < 5) & (times.hour >= 6.0) & (times.hour < 20.0)
    air_kw = running * (38.0 - 5.0 * season + 1.2 * noise.wander(len(times), 0.7))
    bank_on = running.copy()
    for planted in PLANTED:
        if planted.service == "office" and planted.kind == "leading":
            bank_on |= window(times, planted.key)
    admittance = capacitor_siemens(np.where(bank_on, 20.0, 0.0))
    admittance[1, window(times, "office-heater")] += 18000.0 / NOMINAL_LN_V**2
    load = Load(
        power=_shared(plain_kw + 1j * plain_kvar, (0.342, 0.325, 0.333), noise, 0.010),
        admittance=admittance,
        motors=np.asarray(air_kw * (1.0 + 0.62j) * 1000.0),
    )
    supply = _supply(times, noise, 1.018, (0.9970, 1.0010, 1.0020))
    solved = solve(times, supply, load, Source(0.010 + 0.018j, 0.012 + 0.012j), 315.0)
    # Electronics draw third harmonics, 6 % of their current, which add up in the neutral.
    triplen_a = 3.0 * 0.06 * plain_kw * 1000.0 / (3.0 * NOMINAL_LN_V)
    neutral = np.sqrt(solved.i_neutral_a**2 + triplen_a**2)
    return Record(times, solved.v, solved.i, neutral, solved.rating_a)


def workshop() -> Record:
    """A night shift: furnaces and drives from 21:00 to 05:30, little by day."""
    times, noise = grid(FIRST, LAST, 15), Noise(4303)
    night = by_day(
        times,
        [(0, 0.96), (1, 1.0), (1.9, 0.95), (2.1, 0.72), (2.6, 0.74), (2.9, 0.97), (5.25, 0.90),
         (5.75, 0.22), (7.5, 0.15), (9, 0.24), (15, 0.20), (18, 0.13), (20.75, 0.16),
         (21.25, 0.88), (24, 0.96)],
        [(0, 0.95), (1.9, 0.92), (2.1, 0.7), (2.6, 0.7), (2.9, 0.9), (5.25, 0.85),
         (5.75, 0.16), (8, 0.10), (24, 0.09)],
        [(0, 0.09), (12, 0.08), (20.75, 0.10), (21.25, 0.82), (24, 0.92)],
    )  # fmt: skip
    wander = 1.0 + 0.05 * noise.wander(len(times), 0.75) + 0.015 * noise.bell(len(times))
    drives_kw = 4.0 + 62.0 * night * wander
    furnace_kw = 58.0 * night * (1.0 + 0.06 * noise.wander(len(times), 0.6))
    furnace_kw[window(times, "workshop-overload")] += 68.0
    motors_kw = 2.0 + 7.0 * night * wander
    supply = _supply(times, noise, 1.016, (1.0010, 1.0030, 0.9960))
    supply[:, window(times, "workshop-low-voltage")] *= 0.872
    plain = drives_kw * (1.0 + 0.17j) + furnace_kw * (1.0 + 0.04j)
    load = Load(
        power=_shared(plain, (0.341, 0.329, 0.330), noise, 0.010),
        admittance=_no_admittance(len(times)),
        motors=np.asarray(motors_kw * (1.0 + 0.70j) * 1000.0),
    )
    return solve(times, supply, load, Source(0.012 + 0.020j, 0.012 + 0.014j), 250.0)


def _fixed_speed(times: Grid, noise: Noise, want: Floats) -> tuple[Floats, Floats, Floats]:
    """Return minute by minute what a fixed-speed compressor does: loaded, idling, starting."""
    loaded, idling, starting = (np.zeros(len(times)) for _ in range(3))
    state, left = "off", 0
    chance, stretch = noise.uniform(len(times)), noise.uniform(len(times))
    for minute in range(len(times)):
        if left > 0:
            left -= 1
        elif state == "off" and chance[minute] < 0.02 * want[minute]:
            state, left = "loaded", int(8 + 50 * stretch[minute] * want[minute])
            starting[minute] = 1.0
        elif state == "loaded":
            state, left = "idling", int(2 + 3 * stretch[minute])
        elif state == "idling":
            again = chance[minute] < 0.6 * want[minute]
            state, left = ("loaded", int(8 + 40 * stretch[minute])) if again else ("off", 4)
        loaded[minute], idling[minute] = state == "loaded", state == "idling"
    return loaded, idling, starting


def compressors() -> Record:
    """A compressor room minute by minute: one drive, one fixed-speed machine, a dryer."""
    times, noise = grid("2026-11-01 00:00", LAST, 1), Noise(4404)
    air = by_day(
        times,
        [(0, 0.35), (5.7, 0.33), (6.1, 0.85), (9, 1.0), (12, 0.95), (12.2, 0.65), (12.8, 0.65),
         (13, 1.0), (18, 0.88), (21.8, 0.8), (22.2, 0.4), (24, 0.35)],
        [(0, 0.33), (5.7, 0.3), (6.2, 0.7), (13.8, 0.65), (14.3, 0.0), (24, 0.0)],
        [(0, 0.0), (22, 0.0), (22.5, 0.2), (24, 0.35)],
    )  # fmt: skip
    fault = window(times, "compressors-unloaded")
    loaded, idling, starting = _fixed_speed(times, noise, np.where(air > 0.5, air, 0.0))
    drive = np.clip(air * (0.85 + 0.12 * noise.wander(len(times), 0.97)), 0.0, 1.05) * (air > 0.05)
    drive_kw = (6.0 + 38.0 * drive + 0.8 * noise.bell(len(times)) * (drive > 0)) * (drive > 0)
    dryer_kw = 4.0 + 0.15 * noise.wander(len(times), 0.9)
    # Its own capacitor holds the loaded machine at 0.97; idling it keeps its magnetising current.
    machine = loaded * (39.0 + 9.6j) + idling * (10.5 + 9.0j) + starting * (14.0 + 40.0j)
    machine = np.where(fault, 12.0 + 24.0j + 0.3 * noise.bell(len(times)), machine)
    steady = drive_kw * (1 + 0.16j) + dryer_kw * (1 + 0.2j)
    load = Load(
        power=_shared(steady, (0.334, 0.330, 0.336), noise, 0.006),
        admittance=_no_admittance(len(times)),
        motors=np.asarray(machine * 1000.0),
    )
    supply = _supply(times, noise, 1.021, (1.0030, 0.9985, 0.9985))
    return solve(times, supply, load, Source(0.010 + 0.022j, 0.010 + 0.014j), 200.0)


def records() -> dict[str, Record]:
    """Return the true record of every service, by service id."""
    return {
        "plant": plant(),
        "office": office(),
        "workshop": workshop(),
        "compressors": compressors(),
    }
