"""The P–Q plane: where in active and reactive power the load lives."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import polars as pl

from meterlens.report.record import Record
from meterlens.report.series import stride
from meterlens.report.theme import HOUR_SCALE, Figure, Json, axis, pack, plot_layout, tag
from meterlens.report.words import percent

__all__ = ["plane"]

_MOST_DOTS = 8_000
_FULL_PF = 0.9999  # a target this near unity has no wedge to draw


def plane(record: Record, frame: pl.DataFrame) -> Figure:
    """Draw the intervals in the P–Q plane with the wedge of the target power factor."""
    title = "The P–Q plane"
    if not {"p_kw", "q_kvar", "start_local"} <= set(frame.columns):
        return Figure("plane", title, "", "", linked=False, missing="P and Q are not known.")
    rows = frame.select("start_local", "p_kw", "q_kvar", "interval_min").drop_nulls()
    rows = rows.filter(pl.col("p_kw").is_finite() & pl.col("q_kvar").is_finite())
    if rows.is_empty():
        return Figure("plane", title, "", "", linked=False, missing="P and Q are not known.")
    per_day = max(1, round(1440 / float(rows["interval_min"][0])))
    step = stride(rows.height, _MOST_DOTS, per_day)
    kept = rows.gather_every(step)
    p, q = kept["p_kw"].to_numpy(), kept["q_kvar"].to_numpy()
    hour = (kept["start_local"].dt.hour() + kept["start_local"].dt.minute() / 60).to_numpy()
    target = record.service.target_pf
    reach = float(np.max(np.abs(p)))
    layout = _plane_layout(p, q, target, reach)
    traces = [*_wedge(target, reach), _dots(p, q, hour)]
    beyond = float(np.mean(q > np.abs(p) * math.tan(math.acos(min(1.0, target)))))
    choice = "Every interval is drawn" if step == 1 else f"One interval in {step} is drawn"
    caption = (
        f"{choice} at its active and reactive power, coloured by the hour of the local day. "
        f"The shaded wedge holds the points that meet the target power factor of {target:g} on "
        "the lagging side; what lies above it draws more reactive power than the target allows, "
        "what lies below zero is leading. Both axes have the same scale, so the angle to the "
        "horizontal is the angle of the load."
    )
    label = f"Scatter of reactive against active power; {percent(beyond)} lie above the target."
    return Figure("plane", title, caption, label, traces, layout, linked=False)


def _plane_layout(p: Any, q: Any, target: float, reach: float) -> Json:
    """Lay out the plane with one scale for both axes, its height following the readings."""
    spans = []
    for values in (p, q):
        low, high = min(0.0, float(values.min())), max(0.0, float(values.max()))
        pad = 0.06 * (high - low) or 1.0
        spans.append([low - (pad if low < 0 else pad / 3), high + pad])
    aspect = (spans[1][1] - spans[1][0]) / (spans[0][1] - spans[0][0])
    free = {"zeroline": True, "fixedrange": False, "constrain": "domain"}
    layout = plot_layout(
        560,
        hovermode="closest",
        xaxis=axis(range=spans[0], ticks="outside", constraintoward="left", **free),
        yaxis=axis(range=spans[1], scaleanchor="x", constraintoward="top", **free),
        annotations=[
            tag("Q, kvar: lagging up, leading down"),
            tag("P, kW", xref="x domain", x=1, xanchor="right", y=0, yanchor="top", yshift=-22),
        ],
        showlegend=False,
        meta={"aspect": round(aspect, 4)},
    )
    layout["margin"] = layout["margin"] | {"b": 108}
    if target < _FULL_PF and reach > 0:
        slope = math.tan(math.acos(target))
        note = tag(f"target {target:g}", xref="x", x=reach, xanchor="right", yref="y")
        note |= {"y": reach * slope * 0.5, "yanchor": "middle", "yshift": 0}
        layout["annotations"].append(note)
    return layout


def _wedge(target: float, reach: float) -> list[Json]:
    if target >= _FULL_PF or reach <= 0:
        return []
    slope = math.tan(math.acos(target))
    return [
        {
            "type": "scatter",
            "mode": "lines",
            "name": f"meets {target:g} lagging",
            "x": [0, reach, reach, 0],
            "y": [0, reach * slope, 0, 0],
            "fill": "toself",
            "fillcolor": "@good",
            "line": {"color": "@good", "width": 0},
            "hoverinfo": "skip",
        },
        {
            "type": "scatter",
            "mode": "lines",
            "name": f"{target:g} lagging",
            "x": [0, reach],
            "y": [0, reach * slope],
            "line": {"color": "@limit", "width": 1.5, "dash": "dash"},
            "hoverinfo": "skip",
        },
    ]


def _dots(p: Any, q: Any, hour: Any) -> Json:
    return {
        "type": "scatter",
        "mode": "markers",
        "name": "intervals",
        "showlegend": False,
        "x": pack(p),
        "y": pack(q),
        "hovertemplate": "%{x:,.1f} kW, %{y:,.1f} kvar<extra></extra>",
        "marker": {
            "size": 4,
            "opacity": 0.7,
            "color": pack(hour),
            "cmin": 0,
            "cmax": 24,
            "colorscale": HOUR_SCALE,
            "colorbar": {
                "orientation": "h",
                "x": 0,
                "xanchor": "left",
                "yref": "container",
                "y": 0,
                "yanchor": "bottom",
                "xpad": 0,
                "tickvals": [0, 6, 12, 18, 24],
                "ticktext": ["0 h", "6 h", "12 h", "18 h", "24 h"],
                "tickfont": {"size": 11, "color": "@muted"},
                "thickness": 10,
                "len": 0.7,
                "outlinewidth": 0,
            },
        },
    }
