"""Charts of the record itself: periods on a time line, and how complete the days are."""

from __future__ import annotations

import math
from datetime import date, datetime, time, timedelta
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import polars as pl

from meterlens.report.facts import ServiceFacts
from meterlens.report.record import Record
from meterlens.report.theme import Figure, Json, axis, pack, plot_layout, tag, time_axis
from meterlens.report.words import PERIOD_KINDS, local_ms, number, plain, share, size_words, when

__all__ = ["coverage", "day_shares", "periods"]

_MOST_BARS = 3_000
_ROW_PX = 46


def periods(record: Record, entries: list[dict[str, Any]]) -> Figure:
    """Draw the periods of each kind as bars on the time line."""
    title = "Periods"
    if not entries or not record.grid.segments:
        return Figure("periods", title, "", "", missing="No period of any kind was found.")
    kinds = list(PERIOD_KINDS)
    kinds += sorted({str(e.get("kind")) for e in entries} - set(kinds))
    kept = _longest(entries)
    traces, notes = [], []
    for row, kind in enumerate(kinds):
        mine = [e for e in entries if e.get("kind") == kind]
        hours = sum(float(e.get("hours") or 0) for e in mine)
        count = f"{len(mine)} period{'' if len(mine) == 1 else 's'}, {number(hours)} h"
        text = f"{plain(PERIOD_KINDS.get(kind, kind))}: {count if mine else 'none'}"
        notes.append(tag(text, yref="y", y=row - 0.28, yshift=2))
        bars = [e for e in kept if e.get("kind") == kind]
        if bars:
            traces.append(_bars(record, row, kind, bars))
    layout = plot_layout(
        _ROW_PX * len(kinds) + 70,
        xaxis=time_axis(*record.grid.span),
        yaxis=axis(
            range=[len(kinds) - 0.6, -0.95],
            showticklabels=False,
            ticks="",
            showgrid=False,
            zeroline=False,
            automargin=False,
        ),
        annotations=notes,
        hovermode="closest",
        showlegend=False,
        barmode="overlay",
    )
    layout["margin"] = {"l": 18, "r": 18, "t": 8, "b": 48}
    caption = (
        "A period is an unbroken run of intervals of one kind. Each bar runs from its start to "
        "its end in local time; kinds and limits are those of the review. Only runs count that "
        "pass the limit at which a period begins, the load floor and the shortest length, so "
        "their hours are mostly fewer than the month’s hours below target or leading."
    )
    if len(kept) < len(entries):
        caption += f" The {len(kept)} longest of {len(entries)} periods are drawn."
    label = f"Time line of {len(entries)} periods in {len(kinds)} kinds."
    return Figure("periods", title, caption, label, traces, layout)


def _longest(entries: list[dict[str, Any]]) -> list[dict[str, Any]]:
    known = [e for e in entries if not math.isnan(local_ms(e.get("start")))]
    if len(known) <= _MOST_BARS:
        return known
    known.sort(key=lambda e: (-float(e.get("hours") or 0), local_ms(e["start"])))
    return sorted(known[:_MOST_BARS], key=lambda e: local_ms(e["start"]))


def _bars(record: Record, row: int, kind: str, bars: list[dict[str, Any]]) -> Json:
    starts = np.array([local_ms(e["start"]) for e in bars])
    # The wall clock can run backwards in autumn: a bar is at least as wide as its hours.
    ends = np.array([local_ms(e.get("end")) for e in bars])
    spans = np.array([float(e.get("hours") or 0) * 3_600_000 for e in bars])
    widths = np.where(np.isfinite(ends) & (ends > starts), ends - starts, spans)
    names = dict(zip("abc", record.service.phase_labels, strict=True))
    words = []
    for e in bars:
        phase = e.get("phase")
        parts = [f"{when(e['start'])} to {when(e.get('end'))}", f"{number(e.get('hours'))} h"]
        if phase:
            parts.append(plain(names.get(str(phase), phase)))
        if e.get("worst") is not None:
            parts.append(f"worst {plain(size_words(kind, e['worst'], e.get('unit')))}")
        words.append("<br>".join(parts))
    return {
        "type": "bar",
        "orientation": "h",
        "name": plain(PERIOD_KINDS.get(kind, kind)),
        "base": pack(starts, "f8"),
        "x": pack(widths, "f8"),
        "y": pack(np.full(len(bars), float(row))),
        "width": 0.42,
        # The outline keeps a quarter of an hour visible in a year.
        "marker": {"color": "@p", "line": {"color": "@p", "width": 1.2}},
        "hovertext": words,
        "hovertemplate": "%{hovertext}<extra></extra>",
    }


def day_shares(service: ServiceFacts, frame: pl.DataFrame) -> dict[date, float]:
    """Return, for every local day from first to last, the share of its minutes that is known.

    A minute is known when its interval has a total active power (any current or voltage
    where the record has no power at all). Days of a clock change have 23 or 25 hours.
    """
    if frame.is_empty():
        return {}
    marks = [c for c in ("p_kw", "i_a", "v_a", "v_ab") if c in frame.columns]
    mark = next((c for c in marks if frame[c].null_count() < frame.height), None)
    known = pl.lit(False) if mark is None else pl.col(mark).is_not_null()
    minutes = (
        frame.group_by(pl.col("start_local").dt.date().alias("day"))
        .agg(pl.col("interval_min").filter(known).sum().alias("minutes"))
        .sort("day")
    )
    found = dict(zip(minutes["day"].to_list(), minutes["minutes"].to_list(), strict=True))
    zone = ZoneInfo(service.timezone)
    first, last = minutes["day"][0], minutes["day"][-1]
    shares = {}
    for step in range((last - first).days + 1):
        day = first + timedelta(days=step)
        shares[day] = min(1.0, float(found.get(day) or 0.0) / _day_minutes(day, zone))
    return shares


def _day_minutes(day: date, zone: ZoneInfo) -> float:
    """Return the true length of a local day, minutes."""
    begin = datetime.combine(day, time(), zone)
    after = datetime.combine(day + timedelta(days=1), time(), zone)
    # Same zone object on both sides: plain subtraction would ignore the offsets.
    shift = (after.utcoffset() or timedelta()) - (begin.utcoffset() or timedelta())
    return 1440.0 - shift.total_seconds() / 60


def coverage(record: Record, frame: pl.DataFrame) -> Figure:
    """Draw a calendar, a month a row and a day a cell, of how complete the record is."""
    title = "Data coverage"
    shares = day_shares(record.service, frame)
    if not shares:
        return Figure("coverage", title, "", "", linked=False, missing="There are no intervals.")
    months = sorted({(day.year, day.month) for day in shares})
    rows: list[list[float | None]] = [[None] * 31 for _ in months]
    texts = [[""] * 31 for _ in months]
    place = {month: row for row, month in enumerate(months)}
    for day, part in shares.items():
        row = place[day.year, day.month]
        rows[row][day.day - 1] = round(part, 4)
        texts[row][day.day - 1] = f"{day.isoformat()}: {share(part)} covered"
    trace: Json = {
        "type": "heatmap",
        "z": rows,
        "x0": 1,
        "dx": 1,
        "y": [f"{year}-{month:02d}" for year, month in months],
        "zmin": 0,
        "zmax": 1,
        "colorscale": [[0.0, "@low"], [0.5, "@mid"], [0.995, "@mid"], [1.0, "@full"]],
        "text": texts,
        "hovertemplate": "%{text}<extra></extra>",
        "hoverongaps": False,
        "xgap": 2,
        "ygap": 2,
        "showscale": False,
    }
    layout = plot_layout(
        30 * len(months) + 92,
        hovermode="closest",
        xaxis=axis(
            range=[0.5, 31.5], tickvals=[1, 5, 10, 15, 20, 25, 31], showgrid=False, zeroline=False
        ),
        yaxis=axis(type="category", autorange="reversed", showgrid=False),
        annotations=[tag("day of the month")],
        showlegend=False,
    )
    layout["margin"] = {"l": 70, "r": 18, "t": 30, "b": 40}
    short = sum(1 for part in shares.values() if part < 1)
    caption = (
        "Each cell is a local day: green-blue when every minute has a total active power, amber "
        "when some are missing, red when most or all are. Days of a clock change have 23 or 25 "
        "hours and count by their true length. Missing intervals are never filled in."
    )
    label = f"Calendar of {len(shares)} days; {short} of them are incomplete."
    return Figure("coverage", title, caption, label, [trace], layout, linked=False)
