"""Made-up services for the tests of the pages: two months of quarter hours, one of minutes.

The currents, voltages and power factors are drawn from a fixed seed; powers, impedances
and imbalance follow from their definitions, so the charts look like a real record's.
"""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import polars as pl

from meterlens.report.pages import ServiceFacts, ServicePage

ZONE = "Europe/Lisbon"
QUARTERS = ServiceFacts(
    id="main",
    name="Main switchboard",
    connection="wye-4w",
    timezone=ZONE,
    nominal_voltage_v=400,
    rating_a=800,
    target_pf=0.95,
    angle_grade="nominal",
    phase_labels=("L1", "L2", "L3"),
)
MINUTES = ServiceFacts(
    id="annex",
    name="Annex, test bay",
    connection="wye-4w",
    timezone=ZONE,
    nominal_voltage_v=400,
    rating_a=250,
    angle_grade="measured",
)


def readings(
    start: datetime, count: int, minutes: int, scale: float = 1.0, seed: int = 7
) -> pl.DataFrame:
    """Return `count` intervals from `start` (naive UTC) with every derived column."""
    rng = np.random.default_rng(seed)
    utc = [start + timedelta(minutes=minutes * n) for n in range(count)]
    zone = ZoneInfo(ZONE)
    local = [t.replace(tzinfo=UTC).astimezone(zone).replace(tzinfo=None) for t in utc]
    hour = np.array([t.hour + t.minute / 60 for t in local])
    working = np.array([t.weekday() < 5 for t in local])
    shift = np.exp(-(((hour - 12.5) / 4.2) ** 4)) * np.where(working, 1.0, 0.18)
    base = scale * (90 + 430 * shift)
    i = base * np.array([[1.0], [0.88], [1.07]]) * (1 + 0.06 * rng.standard_normal((3, count)))
    i[:, (hour > 3) & (hour < 3.4)] *= 0.05
    v = 231 - 0.012 * i / scale + 0.8 * rng.standard_normal((3, count))
    v[1, 400:404] = 203.0
    pf = np.clip(0.80 + 0.13 * (1 - shift) + 0.015 * rng.standard_normal((3, count)), 0.3, 1)
    side = np.where((hour < 5) & (np.arange(count) % 3 > 0), -1.0, 1.0)
    p = v * i * pf / 1000
    q = side * np.sqrt((v * i / 1000) ** 2 - p**2)
    z = v / i * np.exp(1j * np.arctan2(q, p))
    a = np.exp(2j * np.pi / 3)
    turn = np.array([[1], [a**2], [a]])
    volts, amps = v * turn, i * np.exp(-1j * np.arctan2(q, p)) * turn
    v1, i1 = (volts * turn.conj()).mean(0), (amps * turn.conj()).mean(0)
    v2 = (volts * turn).mean(0)
    light = i.max(0) < 0.02 * 800 * scale
    total_p, total_q = p.sum(0), q.sum(0)
    s = np.hypot(total_p, total_q)
    columns: dict[str, object] = {
        "start_utc": utc,
        "start_local": local,
        "interval_min": np.full(count, float(minutes)),
        "p_kw": total_p,
        "q_kvar": total_q,
        "s_vector_kva": s,
        "pf_vector": np.where(light, np.nan, total_p / s),
        "r_delta_ohm": np.where(light, np.nan, (3 * v1 / i1).real),
        "x_delta_ohm": np.where(light, np.nan, (3 * v1 / i1).imag),
        "vuf": np.abs(v2) / np.abs(v1),
        "lvur": np.abs(v2) / np.abs(v1),
        "current_unbalance": np.where(light, np.nan, np.abs(i - i.mean(0)).max(0) / i.mean(0)),
        "i_n_a": np.abs(amps.sum(0)),
    }
    for row, k in enumerate("abc"):
        columns |= {f"v_{k}": v[row], f"i_{k}": i[row]}
        columns |= {
            f"r_wye_{k}_ohm": np.where(light, np.nan, z[row].real),
            f"x_wye_{k}_ohm": np.where(light, np.nan, z[row].imag),
        }
    return pl.DataFrame(columns).with_columns(pl.selectors.float().fill_nan(None))


def _month(month: str, energy: float, factor: float, peak: float) -> dict[str, object]:
    return {
        "month": month,
        "completeness": 0.987,
        "energy_kwh": energy,
        "reactive_lagging_kvarh": energy * 0.55,
        "reactive_leading_kvarh": 1020.0,
        "pf_energy_weighted": factor,
        "peak_demand_kw": peak,
        "peak_demand_start": f"{month}-14T11:15:00+01:00",
        "peak_demand_kva": peak / 0.83,
        "pf_at_peak": 0.831,
        "load_factor": 0.48,
        "peak_current_a": 668.2,
        "peak_current_phase": "c",
        "peak_current_utilisation": 0.835,
        "low_pf_hours": 214.25,
        "leading_hours": 88.0,
        "kvarh_above_target": 23810.0,
        "vuf_p95": 0.0051,
        "current_unbalance_p95": 0.172,
        "neutral_current_max_a": None,
        "hours_outside_voltage_band": 1.0,
        "cost": {"total": 31877.4},
        "notes": [{"key": "neutral_current_max_a", "reason": "the neutral was not metered"}],
    }


def _finding(severity: str, kind: str, text: str, **more: object) -> dict[str, object]:
    base: dict[str, object] = {
        "kind": kind,
        "service": "main",
        "phase": None,
        "start": "2026-10-05T07:00:00+01:00",
        "end": "2026-10-30T17:00:00+00:00",
        "severity": severity,
        "magnitude": 23810.0,
        "low": 21100.0,
        "high": 26600.0,
        "unit": "kvarh",
        "cost_per_month": 171.43,
        "confidence": "good",
        "text": text,
        "next_step": "Look at the correction study before any bank is bought.",
    }
    return base | more


def quarters_page(name: str = QUARTERS.name) -> ServicePage:
    """Return two months of quarter hours with a gap and the autumn clock change."""
    frame = readings(datetime(2026, 9, 30, 23), 61 * 96 + 4, 15)
    frame = pl.concat([frame[:2000], frame[2130:]])
    facts = {f: getattr(QUARTERS, f) for f in QUARTERS.__dataclass_fields__} | {"name": name}
    starts = [datetime(2026, 10, 1, 7) + timedelta(days=n) for n in range(0, 60, 2)]
    periods = [
        {
            "service": "main",
            "kind": "low-pf" if n % 3 else "current-imbalance",
            "phase": None if n % 3 else "c",
            "start": start.isoformat() + "+01:00",
            "end": (start + timedelta(hours=9 - n % 4)).isoformat() + "+01:00",
            "hours": float(9 - n % 4),
            "intervals": 36,
            "worst": 0.78 if n % 3 else 0.31,
            "mean": 0.83 if n % 3 else 0.22,
            "unit": "fraction",
            "energy_kwh": 2950.0,
            "kvarh_above_target": 930.0 if n % 3 else None,
        }
        for n, start in enumerate(starts)
    ]
    check = {
        "service": "main",
        "first": "2026-10-01T00:00:00+01:00",
        "last": "2026-12-01T00:00:00+00:00",
        "interval_min": 15,
        "completeness": 0.978,
        "gaps": [
            {
                "start": "2026-10-21T20:00:00+01:00",
                "end": "2026-10-23T04:30:00+01:00",
                "missing_intervals": 130,
            }
        ],
        "findings": [],
    }
    findings = [
        _finding("look", "current-imbalance", "L3 carries 12 % more than the mean.", phase="c"),
        _finding("act", "low-pf", "Power factor stays below 0.95 through the working day."),
    ]
    months = [
        _month("2026-10", 88340.0, 0.874, 301.6),
        _month("2026-11", 84210.0, 0.881, 297.3),
    ]
    return ServicePage(ServiceFacts(**facts), frame, months, periods, check, findings)


def minutes_page() -> ServicePage:
    """Return 44 days of minutes: more points than a chart draws one by one."""
    frame = readings(datetime(2026, 6, 30, 23), 44 * 1440, 1, scale=0.3, seed=3)
    check = {
        "service": "annex",
        "first": "2026-07-01T00:00:00+01:00",
        "last": "2026-08-14T00:00:00+01:00",
        "interval_min": 1,
        "completeness": 1.0,
        "gaps": [],
        "findings": [],
    }
    return ServicePage(MINUTES, frame, [_month("2026-07", 27110.0, 0.91, 94.0)], [], check, [])
