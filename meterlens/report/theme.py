"""Colours, type and the common frame of every chart.

A chart names its colours by *token* (``"@a"``, ``"@ink"``); the page's script puts the
light or the dark palette in when it draws, so one figure serves both. Phases differ by
label and dash as well as by colour, and the phase colours stay apart under the three
common colour-vision deficiencies (a unit test simulates them).
"""

from __future__ import annotations

import base64
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any, Final

import numpy as np
import numpy.typing as npt

__all__ = [
    "CONFIG",
    "DARK",
    "FONT",
    "HOUR_SCALE",
    "LIGHT",
    "PHASE_DASH",
    "Figure",
    "Json",
    "axis",
    "limit_line",
    "pack",
    "plot_layout",
    "tag",
    "time_axis",
]

Json = dict[str, Any]

FONT: Final = (
    'system-ui, -apple-system, "Segoe UI", Roboto, "Noto Sans", "DejaVu Sans", Arial, sans-serif'
)

LIGHT: Final[dict[str, str]] = {
    "page": "#f5f5f1",
    "paper": "#ffffff",
    "ink": "#1c2427",
    "muted": "#56626a",
    "grid": "#e4e7e6",
    "line": "#a9b2b4",
    "rule": "#d3d8d7",
    "link": "#17568f",
    "a": "#1a5ca8",
    "b": "#c4690a",
    "c": "#2b8f80",
    "n": "#70757b",
    "p": "#1f4e79",
    "q": "#c4690a",
    "s": "#84898f",
    "limit": "#b02a37",
    "good": "#dcebe6",
    "band": "#f0f1ec",
    "mark": "#1c2427",
    "low": "#b02a37",
    "mid": "#e5b567",
    "full": "#3c8c84",
    "h0": "#2d3277",
    "h6": "#3792a8",
    "h12": "#e3ab32",
    "h18": "#b14a6a",
}

DARK: Final[dict[str, str]] = {
    "page": "#12171a",
    "paper": "#192024",
    "ink": "#e4e8e8",
    "muted": "#a4b0b5",
    "grid": "#2b3439",
    "line": "#5d6a70",
    "rule": "#333e43",
    "link": "#8cc0f5",
    "a": "#5a96e6",
    "b": "#f2a950",
    "c": "#7fe0b8",
    "n": "#a2a9ae",
    "p": "#8fbce8",
    "q": "#f2a950",
    "s": "#8f979d",
    "limit": "#ff8b8b",
    "good": "#21413c",
    "band": "#20292d",
    "mark": "#e4e8e8",
    "low": "#b8404f",
    "mid": "#e8c071",
    "full": "#4fa79d",
    "h0": "#8d95ea",
    "h6": "#4fb6cc",
    "h12": "#f0c14f",
    "h18": "#e0799a",
}

PHASE_DASH: Final[dict[str, str]] = {"a": "solid", "b": "7px,2px", "c": "2px,1.5px", "n": "dot"}

# Hours come round again, so the scale ends where it began.
HOUR_SCALE: Final[list[list[Any]]] = [
    [0.0, "@h0"],
    [0.25, "@h6"],
    [0.5, "@h12"],
    [0.75, "@h18"],
    [1.0, "@h0"],
]

# The chart is one image to assistive technology; the page carries the buttons instead of
# the library's own bar, and nothing of it may offer to send the readings anywhere.
CONFIG: Final[Json] = {
    "displayModeBar": False,
    "displaylogo": False,
    "doubleClick": "reset",
    "responsive": True,
    "scrollZoom": False,
    "showSendToCloud": False,
}

_TICKS: Final[list[Json]] = [
    {"dtickrange": [None, 86_399_999], "value": "%H:%M<br>%d %b"},
    {"dtickrange": [86_400_000, 604_799_999], "value": "%d %b<br>%Y"},
    {"dtickrange": [604_800_000, "M1"], "value": "%d %b<br>%Y"},
    {"dtickrange": ["M1", "M12"], "value": "%b<br>%Y"},
    {"dtickrange": ["M12", None], "value": "%Y"},
]


@dataclass(frozen=True)
class Figure:
    """One chart with its words.

    Attributes
    ----------
    key : str
        Fixed name, used for element ids.
    title : str
        Heading, plain words.
    caption : str
        What it shows and how that is computed.
    label : str
        The one-sentence reading for those who cannot see it.
    traces, layout : list, dict
        Plotly figure parts, colours as tokens; empty where there is nothing to draw.
    linked : bool
        Whether it shares the page's time range.
    missing : str
        Why there is no chart; empty where there is one.
    """

    key: str
    title: str
    caption: str
    label: str
    traces: list[Json] = field(default_factory=list)
    layout: Json = field(default_factory=dict)
    linked: bool = True
    missing: str = ""

    @property
    def height(self) -> int:
        """Height of the chart in CSS pixels."""
        return int(self.layout.get("height", 0))


def pack(values: npt.NDArray[Any], kind: str = "f4") -> Json:
    """Encode numbers as a base64 typed array (little-endian).

    Parameters
    ----------
    values : ndarray
        Numbers; NaN stays NaN and is drawn as a gap.
    kind : str
        ``"f4"`` for readings, ``"f8"`` for milliseconds since 1970.
    """
    raw = np.ascontiguousarray(values, dtype=f"<{kind}").tobytes()
    return {"dtype": kind, "bdata": base64.b64encode(raw).decode("ascii")}


def axis(**more: Any) -> Json:
    """Return a plain value axis; keywords override."""
    base: Json = {
        "gridcolor": "@grid",
        "linecolor": "@line",
        "zerolinecolor": "@line",
        "tickcolor": "@line",
        "tickfont": {"color": "@muted", "size": 12},
        "fixedrange": True,
        "automargin": True,
        "separatethousands": True,
    }
    return base | more


def time_axis(start: datetime, end: datetime, **more: Any) -> Json:
    """Return the shared axis of local time from `start` to `end` (naive wall clock)."""
    base = axis(
        type="date",
        range=[start.isoformat(sep=" "), end.isoformat(sep=" ")],
        showline=True,
        ticks="outside",
        tickformatstops=_TICKS,
        hoverformat="%a %d %b %Y, %H:%M",
        fixedrange=False,
        automargin=False,
        nticks=9,
    )
    base.pop("separatethousands")
    return base | more


def plot_layout(height: int, **more: Any) -> Json:
    """Return the common layout; `height` in CSS pixels."""
    base: Json = {
        "height": height,
        "autosize": True,
        "paper_bgcolor": "@paper",
        "plot_bgcolor": "@paper",
        "font": {"family": FONT, "size": 13, "color": "@ink"},
        "margin": {"l": 56, "r": 18, "t": 30, "b": 84},
        "hovermode": "x unified",
        "hoverlabel": {
            "bgcolor": "@paper",
            "bordercolor": "@line",
            "font": {"family": FONT, "size": 12, "color": "@ink"},
        },
        "legend": {
            "orientation": "h",
            "x": 0,
            "xanchor": "left",
            "y": 0,
            "yref": "container",
            "yanchor": "bottom",
            "font": {"size": 12, "color": "@ink"},
            "itemwidth": 40,
            "bgcolor": "@paper",
        },
        "showlegend": True,
        "separators": ".,",
        "uirevision": "keep",
        "dragmode": "zoom",
    }
    return base | more


def tag(text: str, *, yref: str = "y domain", y: float = 1.0, **more: Any) -> Json:
    """Return a small note at the top left of a panel: its unit or its subject."""
    base: Json = {
        "text": text,
        "xref": "paper",
        "x": 0,
        "xanchor": "left",
        "yref": yref,
        "y": y,
        "yanchor": "bottom",
        "yshift": 4,
        "showarrow": False,
        "font": {"size": 12, "color": "@muted"},
    }
    return base | more


def limit_line(value: float, text: str, yref: str = "y") -> tuple[Json, Json]:
    """Return the dashed line of a limit and its label (the line's own unit)."""
    line: Json = {
        "type": "line",
        "xref": "paper",
        "x0": 0,
        "x1": 1,
        "yref": yref,
        "y0": value,
        "y1": value,
        "line": {"color": "@limit", "dash": "dash", "width": 1.5},
    }
    note = tag(text, yref=yref, y=value, x=1, xanchor="right", yshift=1)
    note |= {"font": {"size": 12, "color": "@limit"}, "bgcolor": "@paper", "borderpad": 1}
    return line, note
