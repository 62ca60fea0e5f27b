"""Series as plotly traces: a start, a step and packed values, never a list of times."""

from __future__ import annotations

from typing import Any

import numpy as np

from meterlens.report.series import Floats, Grid, Segment
from meterlens.report.theme import Json, pack

__all__ = ["line_traces"]


def line_traces(
    grid: Grid, values: str | list[Floats], name: str, *, hover: str, **style: Any
) -> list[Json]:
    """Return one line as plotly traces, one a segment, under a single legend entry.

    Parameters
    ----------
    grid : Grid
        The record.
    values : str or list of ndarray
        A column's name, or an array a segment.
    name : str
        Legend entry, already escaped.
    hover : str
        Hover text with ``%{y}``.
    **style
        ``line`` and other trace keys, ``extras`` (an array a segment, as ``customdata``).
    """
    extras = style.pop("extras", None)
    traces: list[Json] = []
    for place, segment in enumerate(grid.segments):
        y = segment.values[values] if isinstance(values, str) else values[place]
        if not np.isfinite(y).any():
            continue
        trace: Json = {
            "type": "scatter",
            "mode": "lines",
            "name": name,
            "legendgroup": name,
            "showlegend": not traces,
            "x0": segment.start_ms,
            "dx": segment.step_ms,
            "y": pack(y),
            "hovertemplate": hover,
            "connectgaps": False,
        } | style
        if extras is not None:
            trace["customdata"] = pack(extras[place])
        traces.append(trace)
        traces.extend(_lone_points(segment, y, trace))
    return traces


def _lone_points(segment: Segment, y: Floats, trace: Json) -> list[Json]:
    """Mark points that have no neighbour: a line through one point would draw nothing."""
    known = np.isfinite(y)
    framed = np.concatenate([[False], known, [False]])
    lone = np.flatnonzero(known & ~framed[:-2] & ~framed[2:])
    if not len(lone):
        return []
    keys = ("type", "name", "legendgroup", "xaxis", "yaxis")
    dot: Json = {key: trace[key] for key in keys if key in trace}
    dot |= {
        "mode": "markers",
        "showlegend": False,
        "hoverinfo": "skip",
        "x": pack(segment.start_ms + lone * float(segment.step_ms), "f8"),
        "y": pack(y[lone]),
        "marker": {"size": 3, "color": trace["line"]["color"]},
    }
    return [dot]
