"""Charts of load: power, currents and power factor."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from meterlens.report.facts import PHASES
from meterlens.report.record import Record, thinning_words
from meterlens.report.theme import (
    PHASE_DASH,
    Figure,
    Json,
    axis,
    limit_line,
    pack,
    plot_layout,
    tag,
    time_axis,
)
from meterlens.report.traces import line_traces
from meterlens.report.words import ASSUMED_SENSE, CURRENT_GRADES, local_ms, number, percent

__all__ = ["currents", "load", "power_factor"]


def load(record: Record, months: list[dict[str, Any]]) -> Figure:
    """Draw active, reactive and apparent power, with the peak demand of each month."""
    grid = record.grid
    title = "Load"
    if not (grid.has("p_kw") or grid.has("q_kvar")):
        return Figure("load", title, "", "", missing="No power is known in this record.")
    hover = "%{y:,.1f} "
    traces = [
        *line_traces(
            grid,
            record.apparent_kva,
            "apparent, kVA",
            hover=hover + "kVA<extra></extra>",
            line={"color": "@s", "width": 1, "dash": "2px,1.5px"},
        ),
        *line_traces(
            grid,
            "q_kvar",
            "reactive, kvar",
            hover=hover + "kvar<extra></extra>",
            line={"color": "@q", "width": 1.2, "dash": "7px,2px"},
        ),
        *line_traces(
            grid,
            "p_kw",
            "active, kW",
            hover=hover + "kW<extra></extra>",
            line={"color": "@p", "width": 1.6},
        ),
        *_peaks(months),
    ]
    layout = plot_layout(
        380,
        xaxis=time_axis(*grid.span),
        yaxis=axis(zeroline=True, rangemode="tozero"),
        annotations=[tag("kW, kvar, kVA")],
    )
    window = record.service.demand_window_min
    caption = (
        "Mean power of each interval. Active power is the sum of the three phases; reactive power "
        "is positive when lagging and negative when leading; apparent power is √(P² + Q²) of the "
        f"totals. A diamond marks each month’s peak demand in kW, the highest complete {window}-"
        "minute window, at the window’s start."
    ) + thinning_words(grid, "the mean of its intervals, which hides the shortest peaks")
    if record.service.sense_assumed:
        caption += f" {ASSUMED_SENSE}"
    top = np.nanmax(grid.column("p_kw")) if grid.has("p_kw") else None
    label = f"Line chart of active, reactive and apparent power; highest point {number(top)} kW."
    return Figure("load", title, caption, label, traces, layout)


def _peaks(months: list[dict[str, Any]]) -> list[Json]:
    known = [
        m
        for m in months
        if m.get("peak_demand_kw") is not None
        and not math.isnan(local_ms(m.get("peak_demand_start")))
    ]
    if not known:
        return []
    return [
        {
            "type": "scatter",
            "mode": "markers",
            "name": "month’s peak demand, kW",
            "x": pack(np.array([local_ms(m["peak_demand_start"]) for m in known]), "f8"),
            "y": pack(np.array([float(m["peak_demand_kw"]) for m in known])),
            "marker": {
                "symbol": "diamond-open",
                "size": 9,
                "color": "@mark",
                "line": {"width": 1.5, "color": "@mark"},
            },
            "hovertemplate": "%{y:,.1f} kW peak demand<extra></extra>",
        }
    ]


def currents(record: Record) -> Figure:
    """Draw the phase currents against the rating, with the neutral."""
    grid, rating = record.grid, record.service.rating_a
    title = "Currents against the rating" if rating else "Currents"
    drawn = [k for k in PHASES if grid.has(f"i_{k}")]
    if not drawn:
        return Figure("currents", title, "", "", missing="No current is known in this record.")
    traces: list[Json] = []
    if grid.has("i_n_a"):
        traces += line_traces(
            grid,
            "i_n_a",
            "neutral",
            hover="%{y:,.1f} A neutral<extra></extra>",
            line={"color": "@n", "width": 1, "dash": PHASE_DASH["n"]},
        )
    for k in drawn:
        name = record.labels[k]
        traces += line_traces(
            grid,
            f"i_{k}",
            name,
            hover=f"%{{y:,.1f}} A {name}<extra></extra>",
            line={"color": f"@{k}", "width": 1.3, "dash": PHASE_DASH[k]},
        )
    top = max(float(np.nanmax(grid.column(f"i_{k}"))) for k in drawn)
    layout = plot_layout(
        380,
        xaxis=time_axis(*grid.span),
        yaxis=axis(range=[0, 1.1 * max(top, float(rating or 0))]),
        annotations=[tag("A")],
    )
    caption = "Current of each phase, the mean of the interval as metered."
    label = f"Line chart of phase currents; highest {number(top)} A"
    if rating:
        line, note = limit_line(float(rating), f"rating {number(rating)} A")
        layout["shapes"] = [line]
        layout["annotations"].append(note)
        caption += (
            f" The dashed line is the rating of the service, {number(rating)} A a phase; "
            f"the highest point reaches {percent(top / float(rating))} of it."
        )
        label += f" against a rating of {number(rating)} A"
    if grid.has("i_n_a"):
        grade = CURRENT_GRADES.get(record.service.current_angle_grade, "")
        caption += (
            " The neutral is the size of the phasor sum of the three currents; harmonics of order "
            f"three add in a neutral and are not in it. {grade}"
        )
    caption += thinning_words(grid, "the highest of its intervals")
    return Figure("currents", title, caption, label + ".", traces, layout)


def power_factor(record: Record) -> Figure:
    """Draw power factor on a folded axis: lagging below unity, leading above."""
    grid, target = record.grid, record.service.target_pf
    title = "Power factor"
    folded = [
        np.where(side > 0, 1 - pf, np.where(np.isfinite(side), pf - 1, np.nan)).astype(np.float32)
        for pf, side in zip(record.pf, record.leading, strict=True)
    ]
    drawn = np.concatenate(folded) if folded else np.zeros(0, np.float32)
    drawn = drawn[np.isfinite(drawn)]
    if not len(drawn):
        return Figure("pf", title, "", "", missing="No power factor is known in this record.")
    traces = line_traces(
        grid,
        folded,
        "power factor",
        hover="PF %{customdata:.3f}<extra></extra>",
        extras=record.pf,
        line={"color": "@p", "width": 1.3},
    )
    low = min(float(np.quantile(drawn, 0.005)) - 0.02, target - 1.08)
    high = max(float(np.quantile(drawn, 0.995)) + 0.02, 0.06)
    outside = int(np.count_nonzero((drawn < low) | (drawn > high)))
    line, note = limit_line(target - 1, f"target {target:g} lagging")
    if target - 1 > -0.06:
        note |= {"yanchor": "top", "yshift": -1}
    shade = {"type": "rect", "xref": "paper", "x0": 0, "x1": 1, "yref": "y", "layer": "below"}
    shade |= {"y0": 0, "y1": high, "fillcolor": "@band", "line": {"width": 0}}
    layout = plot_layout(
        340,
        xaxis=time_axis(*grid.span),
        yaxis=axis(range=[low, high], zeroline=True, **_folded_ticks(low, high)),
        shapes=[shade, line],
        annotations=[tag("lag below 1, lead above"), note],
        showlegend=False,
    )
    layout["margin"] = layout["margin"] | {"b": 48}
    below = float(np.mean(drawn < target - 1))
    caption = (
        "Power factor |P| / √(P² + Q²) of the three-phase totals in each interval, on one axis "
        "folded at unity: a lagging load is drawn below 1, a leading one in the shaded strip above."
        " Below the light-load floor there is no power factor, and none is drawn."
    )
    if outside > 0:
        caption += (
            f" The axis leaves out the {number(outside, 0)} outermost of {number(len(drawn), 0)} "
            "points."
        )
    if record.service.sense_assumed:
        caption += f" {ASSUMED_SENSE}"
    caption += thinning_words(grid, "its power factor comes from the sums of P and Q")
    label = (
        f"Line chart of power factor; {percent(below)} of the points are lagging and below "
        f"the target of {target:g}."
    )
    return Figure("pf", title, caption, label, traces, layout)


def _folded_ticks(low: float, high: float) -> Json:
    step = 0.05 if high - low < 0.35 else 0.1 if high - low < 0.8 else 0.2
    places = np.arange(math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9) + 1)
    words = []
    for place in places:
        pf = 1 - abs(place * step)
        side = "" if place == 0 else " lead" if place > 0 else " lag"
        words.append(f"{pf:.2f}{side}" if step < 0.1 else f"{pf:.1f}{side}")
    return {"tickvals": [round(float(p) * step, 3) for p in places], "ticktext": words}
