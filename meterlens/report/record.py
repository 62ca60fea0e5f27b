"""One service's record laid out for its charts."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import polars as pl

from meterlens.report.facts import PHASES, ServiceFacts
from meterlens.report.series import Floats, Grid, Join, regular
from meterlens.report.words import minutes_words, plain

__all__ = ["Record", "VoltageLine", "lay_out", "thinning_words"]

_PAIRS = ("ab", "bc", "ca")
_MAX = ("i_a", "i_b", "i_c", "i_n_a", "vuf", "lvur", "current_unbalance")
_OHMS = (
    *(f"r_wye_{k}_ohm" for k in PHASES),
    *(f"x_wye_{k}_ohm" for k in PHASES),
    "r_delta_ohm",
    "x_delta_ohm",
)


@dataclass(frozen=True)
class VoltageLine:
    """One voltage of the chart.

    Attributes
    ----------
    column : str
        Column of the frame, V.
    phase : str
        ``a``, ``b`` or ``c``: gives colour and dash.
    label : str
        What people call it.
    base_v : float
        Its nominal value, V.
    """

    column: str
    phase: str
    label: str
    base_v: float


@dataclass(frozen=True)
class Record:
    """A service, its grid and the series that are worked out from the grid.

    Attributes
    ----------
    service : ServiceFacts
        The settings.
    grid : Grid
        Readings by segment; ``p_kw`` and ``q_kvar`` are kW and kvar.
    voltages : tuple of VoltageLine
        The voltages to draw; empty where none is metered.
    apparent_kva, pf : list of ndarray
        By segment: √(P² + Q²), and |P| over it (fraction).
    leading : list of ndarray
        By segment: +1 leading, −1 lagging, 0 neither, NaN unknown.
    """

    service: ServiceFacts
    grid: Grid
    voltages: tuple[VoltageLine, ...]
    apparent_kva: list[Floats]
    pf: list[Floats]
    leading: list[Floats]

    @property
    def labels(self) -> dict[str, str]:
        """Phase labels by phase, escaped for chart text."""
        names = self.service.phase_labels
        return {k: plain(name) for k, name in zip(PHASES, names, strict=True)}


def lay_out(service: ServiceFacts, frame: pl.DataFrame) -> Record:
    """Lay a service's intervals on the grid of its charts."""
    voltages = _voltage_lines(service, frame)
    joins = {"p_kw": Join("mean"), "q_kvar": Join("mean"), "s_vector_kva": Join("mean")}
    # Points of several intervals take PF from sums of P and Q over the same intervals.
    joins |= {"p_pair": Join("mean"), "q_pair": Join("mean"), "pf_vector": Join("median")}
    joins |= {name: Join("max") for name in _MAX}
    joins |= {name: Join("median") for name in _OHMS}
    joins |= {line.column: Join("farthest", line.base_v) for line in voltages}
    if {"p_kw", "q_kvar"} <= set(frame.columns):
        both = pl.col("p_kw").is_not_null() & pl.col("q_kvar").is_not_null()
        frame = frame.with_columns(
            p_pair=pl.when(both).then("p_kw"), q_pair=pl.when(both).then("q_kvar")
        )
    grid = regular(frame, joins)
    apparent, factor, leading = [], [], []
    for segment in grid.segments:
        p, q = segment.values["p_pair"], segment.values["q_pair"]
        known_pf = segment.values["pf_vector"]
        s = np.hypot(p, q)
        if grid.thinned:
            with np.errstate(divide="ignore", invalid="ignore"):
                # Points whose every interval is below the light-load floor stay empty.
                pf = np.where(np.isfinite(known_pf) & (s > 0), np.abs(p) / s, np.nan)
        else:
            pf = np.abs(known_pf)
            s = np.where(np.isfinite(s), s, segment.values["s_vector_kva"])
        apparent.append(s.astype(np.float32))
        factor.append(pf.astype(np.float32))
        leading.append((-np.sign(p) * np.sign(q)).astype(np.float32))
    return Record(service, grid, voltages, apparent, factor, leading)


def _known(frame: pl.DataFrame, names: list[str]) -> bool:
    return any(n in frame.columns and frame[n].null_count() < frame.height for n in names)


def _voltage_lines(service: ServiceFacts, frame: pl.DataFrame) -> tuple[VoltageLine, ...]:
    """Choose line-to-neutral or line-to-line voltages: what the service is measured by."""
    if not service.nominal_voltage_v:
        return ()
    nominal = float(service.nominal_voltage_v)
    neutral = [f"v_{k}" for k in PHASES]
    across = [f"v_{pair}" for pair in _PAIRS]
    order = [neutral, across] if service.connection == "wye-4w" else [across, neutral]
    chosen = next((names for names in order if _known(frame, names)), None)
    if chosen is None:
        return ()
    names = dict(zip(PHASES, service.phase_labels, strict=True))
    lines = []
    for column, phase in zip(chosen, PHASES, strict=True):
        if chosen is across:
            label = "–".join(names[k] for k in column.removeprefix("v_"))
            base = nominal
        else:
            label, base = names[phase], _neutral_base(service, phase)
        lines.append(VoltageLine(column, phase, plain(label), base))
    return tuple(lines)


def _neutral_base(service: ServiceFacts, phase: str) -> float:
    """Return the nominal line-to-neutral voltage of a phase, V."""
    nominal = float(service.nominal_voltage_v or 0.0)
    if service.connection == "delta-4w" and service.high_leg:
        # The neutral is the middle of one side: half a side to two corners, the
        # triangle's height to the third.
        return nominal * (math.sqrt(3) / 2 if phase == service.high_leg else 0.5)
    return nominal / math.sqrt(3)


def thinning_words(grid: Grid, joined: str) -> str:
    """Say, for a caption, that a point stands for several intervals; empty if it does not."""
    if not grid.thinned:
        return ""
    return (
        f" The record is long, so one point stands for {minutes_words(grid.point_min)}: {joined}."
    )
