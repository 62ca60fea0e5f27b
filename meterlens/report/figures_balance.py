"""Charts of balance, voltage and impedance."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from meterlens.report.facts import PHASES
from meterlens.report.record import Record, thinning_words
from meterlens.report.theme import (
    PHASE_DASH,
    Figure,
    Json,
    axis,
    limit_line,
    plot_layout,
    tag,
    time_axis,
)
from meterlens.report.traces import line_traces
from meterlens.report.words import CURRENT_GRADES, VOLTAGE_GRADES, number, percent, small_percent

__all__ = ["imbalance", "impedance", "voltage"]

_HIGH_SHARE = 0.98  # impedance grows without bound as the load goes to nothing

_VOLTAGE_MEASURES = {
    "vuf": (
        "|V₂| / |V₁|",
        "Voltage imbalance is |V₂| / |V₁|, negative over positive sequence.",
    ),
    "lvur": (
        "largest deviation / mean",
        "Voltage imbalance is the largest deviation of the line-to-line voltages from their "
        "mean, over the mean.",
    ),
}


def imbalance(record: Record) -> Figure:
    """Draw voltage imbalance above current imbalance."""
    grid, grade = record.grid, record.service.angle_grade
    title = "Imbalance"
    measure = next((name for name in ("vuf", "lvur") if grid.has(name)), None)
    shown = [name for name in (measure, "current_unbalance") if name and grid.has(name)]
    if not shown:
        return Figure("imbalance", title, "", "", missing="No imbalance is known in this record.")
    domains = _stacked([1.0] * len(shown), gap=0.16)
    layout = plot_layout(420 if len(shown) > 1 else 300, annotations=[], showlegend=False)
    layout["margin"] = layout["margin"] | {"b": 48}
    traces: list[Json] = []
    words = []
    for place, name in enumerate(shown):
        ref = "y" if place == 0 else "y2"
        layout["yaxis" if place == 0 else "yaxis2"] = axis(
            domain=domains[place], rangemode="tozero", tickformat=".3~%"
        )
        is_voltage = name == measure
        text = _VOLTAGE_MEASURES[name][0] if is_voltage else "largest deviation / mean"
        topic = "voltage" if is_voltage else "current"
        layout["annotations"].append(tag(f"{topic}: {text}", yref=f"{ref} domain"))
        traces += line_traces(
            grid,
            name,
            f"{topic} imbalance",
            hover=f"%{{y:.2%}} {topic}<extra></extra>",
            line={"color": "@p" if is_voltage else "@q", "width": 1.2},
            yaxis=ref,
        )
        p95 = float(np.nanquantile(grid.column(name), 0.95))
        words.append(f"{topic} imbalance is under {percent(p95, 2)} for 95% of the points")
    last = "y" if len(shown) == 1 else "y2"
    layout["xaxis"] = time_axis(*grid.span, anchor=last)
    caption = ""
    if measure:
        caption += f"{_VOLTAGE_MEASURES[measure][1]} {VOLTAGE_GRADES.get(grade, '')} "
    if "current_unbalance" in shown:
        caption += (
            "Current imbalance is the largest deviation of the phase currents from their mean, "
            "over the mean; below the light-load floor it is left out."
        )
    caption = caption.rstrip() + thinning_words(grid, "the highest of its intervals")
    label = "Line chart of imbalance; " + " and ".join(words) + "."
    return Figure("imbalance", title, caption, label, traces, layout)


def voltage(record: Record) -> Figure:
    """Draw each voltage in per unit of its nominal value, with the band."""
    grid, band = record.grid, record.service.voltage_band_pu
    title = "Voltage"
    drawn = [line for line in record.voltages if grid.has(line.column)]
    if not drawn:
        return Figure("voltage", title, "", "", missing="No voltage is known in this record.")
    traces: list[Json] = []
    low, high = np.inf, -np.inf
    for line in drawn:
        values = [s.values[line.column] / np.float32(line.base_v) for s in grid.segments]
        volts = [s.values[line.column] for s in grid.segments]
        joined = np.concatenate(values)
        low, high = min(low, float(np.nanmin(joined))), max(high, float(np.nanmax(joined)))
        traces += line_traces(
            grid,
            values,
            line.label,
            hover=f"%{{customdata:,.1f}} V, %{{y:.3f}} pu {line.label}<extra></extra>",
            extras=volts,
            line={"color": f"@{line.phase}", "width": 1.2, "dash": PHASE_DASH[line.phase]},
        )
    bottom, top = limit_line(band[0], f"{band[0]:g}"), limit_line(band[1], f"{band[1]:g}")
    layout = plot_layout(
        340,
        xaxis=time_axis(*grid.span),
        yaxis=axis(
            range=[
                max(0.0, min(low, band[0]) - 0.015),
                max(high, band[1]) + 0.02,
            ],
            tickformat=".2f",
        ),
        shapes=[bottom[0], top[0]],
        annotations=[tag("per unit of nominal"), bottom[1], top[1]],
    )
    bases = sorted({number(line.base_v, 1) for line in drawn})
    kind = "line-to-line" if len(drawn[0].column) > 3 else "line-to-neutral"
    caption = (
        f"Metered {kind} voltage over its nominal value ({' V and '.join(bases)} V). The dashed "
        f"lines are the band set for this service, {band[0]:g} to {band[1]:g} per unit."
    ) + thinning_words(grid, "the value farthest from nominal among its intervals")
    label = f"Line chart of voltages, from {low:.3f} to {high:.3f} per unit of nominal."
    return Figure("voltage", title, caption, label, traces, layout)


def impedance(record: Record) -> Figure:
    """Draw R and X of each phase as wye, and the balanced delta equivalent."""
    grid = record.grid
    title = "Load impedance"
    phases = [k for k in PHASES if grid.has(f"r_wye_{k}_ohm")]
    delta = grid.has("r_delta_ohm")
    if not (phases or delta):
        return Figure("impedance", title, "", "", missing="No impedance is known in this record.")
    panels: list[tuple[str, list[tuple[str, str, Json]]]] = []
    if phases:
        for part, word in (("r", "R"), ("x", "X")):
            lines = [
                (
                    f"{part}_wye_{k}_ohm",
                    record.labels[k],
                    {"color": f"@{k}", "width": 1.2, "dash": PHASE_DASH[k]},
                )
                for k in phases
            ]
            panels.append((f"{word} as wye, Ω a phase", lines))
    if delta:
        lines = [
            ("r_delta_ohm", "delta R", {"color": "@p", "width": 1.2}),
            ("x_delta_ohm", "delta X", {"color": "@q", "width": 1.2, "dash": "7px,2px"}),
        ]
        panels.append(("balanced delta, Ω an element", lines))
    layout = plot_layout(190 * len(panels) + 110, annotations=[])
    domains = _stacked([1.0] * len(panels), gap=0.1)
    traces: list[Json] = []
    cut = 0.0
    for place, (topic, lines) in enumerate(panels):
        ref = "y" if place == 0 else f"y{place + 1}"
        span, share = _axis_range(record, [name for name, _, _ in lines])
        cut = max(cut, share)
        layout[f"yaxis{place + 1}" if place else "yaxis"] = axis(
            domain=domains[place], range=span, zeroline=True
        )
        layout["annotations"].append(tag(topic, yref=f"{ref} domain"))
        for name, words, style in lines:
            here = line_traces(
                grid,
                name,
                words,
                hover=f"%{{y:.3~f}} Ω {words} {name[0].upper() if place < 2 else ''}"
                "<extra></extra>",
                line=style,
                yaxis=ref,
            )
            if place == 1 and phases:  # the phases already stand in the legend
                here = [trace | {"showlegend": False} for trace in here]
            traces += here
    layout["xaxis"] = time_axis(*grid.span, anchor=ref)
    label = "Line charts of the load’s resistance and reactance by phase over time."
    return Figure("impedance", title, _impedance_words(record, cut), label, traces, layout)


def _axis_range(record: Record, names: list[str]) -> tuple[list[float], float]:
    """Return an axis range that light load cannot blow up, and the share left outside."""
    joined = np.concatenate([record.grid.column(name) for name in names])
    joined = joined[np.isfinite(joined)]
    if not len(joined):
        return [0.0, 1.0], 0.0
    low, high = np.quantile(joined, [1 - _HIGH_SHARE, _HIGH_SHARE])
    # Most records stay well inside these quantiles; only a long tail is cut.
    room = 0.5 * float(high - min(low, 0.0))
    bottom = max(float(joined.min()), float(min(low, 0.0)) - room)
    top = min(float(joined.max()), float(high) + room)
    pad = 0.05 * (top - min(bottom, 0.0)) or 1.0
    span = [min(0.0, bottom - (pad if bottom < 0 else 0.0)), top + pad]
    return span, float(np.mean((joined < span[0]) | (joined > span[1])))


def _impedance_words(record: Record, cut: float) -> str:
    service = record.service
    if service.connection == "wye-4w":
        meaning = "each phase’s voltage to neutral over its current"
    else:
        meaning = "a terminal equivalent, as the meter sees it"
    words = (
        f"Impedance of the load: {meaning}, split by the phase’s power factor into R = |Z| cos φ "
        "and X = |Z| sin φ (X is negative when leading). The balanced delta equivalent is three "
        "times positive-sequence voltage over positive-sequence current, Z = 3 V₁ / I₁; what is "
        "inside a real delta cannot be told from its terminals. Below the light-load floor no "
        f"impedance is given. {VOLTAGE_GRADES.get(service.angle_grade, '')} "
        f"{CURRENT_GRADES.get(service.current_angle_grade, '')}"
    ).rstrip()
    if cut > 0:
        words += (
            " Light load makes impedance soar, so each axis is cut: up to "
            f"{small_percent(cut)} of the points of a panel lie outside."
        )
    return words + thinning_words(record.grid, "the median of its intervals")


def _stacked(panels: Sequence[float], gap: float = 0.11) -> list[list[float]]:
    """Return the vertical domains of stacked panels, the first at the top.

    Parameters
    ----------
    panels : sequence of float
        Relative heights.
    gap : float
        Room between two panels, as a fraction of the plot.
    """
    room = 1.0 - gap * (len(panels) - 1)
    top, domains = 1.0, []
    for share in panels:
        height = room * share / sum(panels)
        domains.append([round(max(0.0, top - height), 4), round(top, 4)])
        top -= height + gap
    return domains
