"""The P–Q plane: where in active and reactive power the load lives."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import polars as pl

from meterlens.report.record import Record
from meterlens.report.series import stride
from meterlens.report.theme import HOUR_SCALE, Figure, Json, axis, pack, plot_layout, tag
from meterlens.report.words import ASSUMED_SENSE, small_percent

__all__ = ["plane"]

_MOST_DOTS = 8_000
_FULL_PF = 0.9999  # a target this near unity has no wedge to draw
_FLATTEST, _STEEPEST = 0.3, 1.25  # height over width: beyond, one scale makes a slit
_LABEL_PX = 58  # room right of the plot for the label at the line's end


@dataclass(frozen=True)
class _View:
    """Ranges of both axes, height over width, and the slope of the target's line."""

    p_span: list[float]
    q_span: list[float]
    aspect: float
    one_scale: bool
    slope: float | None


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
    view = _view(p, q, target)
    traces = [*_wedge(target, view), _dots(p, q, hour)]
    beyond = float(np.mean(q > np.abs(p) * math.tan(math.acos(min(1.0, target)))))
    caption = _words(record, view, step)
    label = (
        "Scatter of reactive against active power; "
        f"{small_percent(beyond)} of the points lie above the target."
    )
    layout = _plane_layout(view, target)
    return Figure("plane", title, caption, label, traces, layout, linked=False)


def _words(record: Record, view: _View, step: int) -> str:
    target = record.service.target_pf
    choice = "Every interval is drawn" if step == 1 else f"One interval in {step} is drawn"
    words = (
        f"{choice} at its active and reactive power, coloured by the hour of the local day; "
        "points below zero are leading."
    )
    if view.slope is not None:
        words += (
            f" The shaded wedge holds the points that meet the target power factor of {target:g} "
            "on the lagging side; what lies above the dashed line draws more reactive power than "
            "the target allows."
        )
    words += (
        " Both axes have the same scale, so the angle to the horizontal is the angle of the load."
        if view.one_scale
        else " The axes have different scales, chosen to fill the chart: an angle drawn here is "
        "not the angle of the load."
    )
    return f"{words} {ASSUMED_SENSE}" if record.service.sense_assumed else words


def _view(p: Any, q: Any, target: float) -> _View:
    """Choose the axes so that the readings and the whole wedge are in view and readable."""
    spans = []
    for values in (p, q):
        low, high = min(0.0, float(values.min())), max(0.0, float(values.max()))
        pad = 0.06 * (high - low) or 1.0
        spans.append([low - (pad if low < 0 else pad / 3), high + pad])
    slope = None
    if target < _FULL_PF and float(p.max()) > 0:
        slope = math.tan(math.acos(target))
        end = spans[0][1] * slope
        spans[1][1] = max(spans[1][1], 1.06 * end)
    aspect = (spans[1][1] - spans[1][0]) / (spans[0][1] - spans[0][0])
    shown = min(max(aspect, _FLATTEST), _STEEPEST)
    return _View(spans[0], spans[1], round(shown, 4), shown == aspect, slope)


def _plane_layout(view: _View, target: float) -> Json:
    """Lay out the plane, its height following its width by the view's aspect."""
    free = {"zeroline": True, "fixedrange": False, "constrain": "domain"}
    tied = {"scaleanchor": "x"} if view.one_scale else {}
    layout = plot_layout(
        560,
        hovermode="closest",
        xaxis=axis(range=view.p_span, ticks="outside", constraintoward="left", **free),
        yaxis=axis(range=view.q_span, constraintoward="top", **tied, **free),
        annotations=[
            tag("Q, kvar: lagging up, leading down"),
            tag("P, kW", xref="x domain", x=1, xanchor="right", y=0, yanchor="top", yshift=-22),
        ],
        showlegend=False,
        meta={"aspect": view.aspect},
    )
    layout["margin"] = layout["margin"] | {"b": 108, "r": _LABEL_PX}
    if view.slope is not None:
        # Outside the plot, where no reading can cover it.
        note = tag(f"target<br>{target:g}", xref="x domain", x=1, xshift=4, yref="y", yshift=0)
        note |= {"y": view.p_span[1] * view.slope, "yanchor": "middle", "align": "left"}
        note["font"] = {"size": 12, "color": "@limit"}
        layout["annotations"].append(note)
    return layout


def _wedge(target: float, view: _View) -> list[Json]:
    if view.slope is None:
        return []
    reach, slope = view.p_span[1], view.slope
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
