"""Interval readings as regular series: a start, a step and packed numbers.

Charts run on the wall clock, which jumps twice a year. The record is therefore cut into
*segments* that each have one UTC offset and one interval length; inside a segment a
missing interval is NaN and is drawn as a gap. A repeated autumn hour is drawn twice, one
pass a segment; a skipped spring hour is an empty hour.

A long record is drawn on a coarser grid. How the intervals of one point are joined
depends on the quantity, and is never an average where an average means nothing.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from datetime import datetime, timedelta
from itertools import pairwise
from typing import Final

import numpy as np
import numpy.typing as npt
import polars as pl

__all__ = ["MOST_POINTS", "Floats", "Grid", "Join", "Segment", "regular", "stride"]

MOST_POINTS: Final = 50_000
_MOST_SEGMENTS: Final = 60
_LONG_GAP: Final = 2_000  # missing intervals beyond which a new segment is cheaper than NaN
_DAY_MS: Final = 86_400_000
_EPOCH: Final = datetime(1970, 1, 1)
_STEPS_MIN: Final = (1, 2, 3, 5, 10, 15, 20, 30, 60, 120, 180, 240, 360, 720, 1440)

Floats = npt.NDArray[np.float32]


@dataclass(frozen=True)
class Join:
    """How several intervals become one point.

    Attributes
    ----------
    how : str
        ``mean`` (powers), ``max`` (currents, imbalance), ``median`` (impedance) or
        ``farthest`` (the value farthest from `reference`: voltages).
    reference : float
        In the column's unit; used by ``farthest`` only.
    """

    how: str
    reference: float = 0.0

    def expression(self, column: str) -> pl.Expr:
        """Return the Polars aggregate of `column`."""
        values = pl.col(column)
        if self.how == "mean":
            return values.mean()
        if self.how == "max":
            return values.max()
        if self.how == "median":
            return values.median()
        above, below = values.max() - self.reference, self.reference - values.min()
        return pl.when(above >= below).then(values.max()).otherwise(values.min()).alias(column)


@dataclass(frozen=True)
class Segment:
    """A run with one UTC offset and one step.

    Attributes
    ----------
    start : datetime
        Wall clock of the first point.
    step_ms : int
        Distance of two points, milliseconds.
    values : dict of ndarray
        float32 by column, NaN where missing; all of one length.
    """

    start: datetime
    step_ms: int
    values: dict[str, Floats]

    def __len__(self) -> int:
        return len(next(iter(self.values.values()), ()))

    @property
    def end(self) -> datetime:
        """Wall clock at the end of the last point."""
        return self.start + timedelta(milliseconds=self.step_ms * len(self))

    @property
    def start_ms(self) -> int:
        """Wall clock of the first point, milliseconds since 1970."""
        return round((self.start - _EPOCH).total_seconds() * 1000)


@dataclass(frozen=True)
class Grid:
    """A whole record, segment by segment.

    Attributes
    ----------
    segments : tuple of Segment
        In the order of time.
    point_min : float
        Minutes a point stands for where the record is thinned, else 0.
    """

    segments: tuple[Segment, ...]
    point_min: float

    @property
    def thinned(self) -> bool:
        """Whether a point stands for several intervals."""
        return self.point_min > 0

    @property
    def span(self) -> tuple[datetime, datetime]:
        """Wall clock of the first start and the last end; a single day if empty."""
        if not self.segments:
            return _EPOCH, _EPOCH + timedelta(days=1)
        return min(s.start for s in self.segments), max(s.end for s in self.segments)

    def column(self, name: str) -> Floats:
        """Return one column of all segments, end to end."""
        parts = [s.values[name] for s in self.segments if name in s.values]
        return np.concatenate(parts) if parts else np.zeros(0, np.float32)

    def has(self, name: str) -> bool:
        """Whether a column holds any number at all."""
        return bool(np.isfinite(self.column(name)).any())


def regular(
    frame: pl.DataFrame, joins: Mapping[str, Join], *, most_points: int = MOST_POINTS
) -> Grid:
    """Lay interval readings on a regular grid of local time.

    Parameters
    ----------
    frame : polars.DataFrame
        ``start_utc``, ``start_local`` (naive), ``interval_min`` and any readings, ordered
        by ``start_utc``.
    joins : mapping of str to Join
        The columns wanted; one that the frame lacks is all NaN.
    most_points : int
        Longest series to draw; beyond it a point stands for several intervals.
    """
    if frame.is_empty():
        return Grid((), 0.0)
    times = frame.select(
        utc=pl.col("start_utc").cast(pl.Datetime("ms")).cast(pl.Int64),
        local=pl.col("start_local").cast(pl.Datetime("ms")).cast(pl.Int64),
        step=(pl.col("interval_min").cast(pl.Float64) * 60_000).round().cast(pl.Int64),
    )
    local, step = times["local"].to_numpy(), times["step"].to_numpy()
    run = _runs(times["utc"].to_numpy(), local, step)
    point_min = _point_minutes(step, most_points)
    wanted = frame.select(
        [
            (
                pl.when(pl.col(name).is_finite()).then(pl.col(name).cast(pl.Float64))
                if name in frame.columns
                else pl.lit(None, pl.Float64).alias(name)
            )
            for name in joins
        ]
    )
    segments = []
    for first, after in _spans(run):
        rows = wanted.slice(first, after - first)
        segments.append(_segment(local[first:after], int(step[first]), rows, joins, point_min))
    return Grid(tuple(segments), point_min)


def _runs(
    utc: npt.NDArray[np.int64], local: npt.NDArray[np.int64], step: npt.NDArray[np.int64]
) -> npt.NDArray[np.int64]:
    """Number the segments: a new one at each change of offset, step or phase of the grid."""
    offset = local - utc
    leap = np.diff(utc)
    hard = (np.diff(offset) != 0) | (np.diff(step) != 0) | (leap > _LONG_GAP * step[:-1])
    # A clock that wanders would make a segment of every row; then rows are put on the
    # nearest grid point instead (at most half an interval away).
    shifted = hard | (leap % step[:-1] != 0)
    breaks = shifted if shifted.sum() <= _MOST_SEGMENTS else hard
    return np.concatenate([[0], np.cumsum(breaks)])


def _spans(run: npt.NDArray[np.int64]) -> Iterator[tuple[int, int]]:
    edges = np.flatnonzero(np.diff(run)) + 1
    bounds = [0, *edges.tolist(), len(run)]
    yield from pairwise(bounds)


def _point_minutes(step: npt.NDArray[np.int64], most_points: int) -> float:
    """Return the minutes one point stands for, 0 where every interval is drawn."""
    if len(step) <= most_points:
        return 0.0
    minutes = float(step.sum()) / 60_000
    finest = float(step.min()) / 60_000
    for choice in _STEPS_MIN:
        if choice > finest and choice % finest == 0 and minutes / choice <= most_points:
            return float(choice)
    return finest * float(np.ceil(minutes / most_points / finest))


def _segment(
    local: npt.NDArray[np.int64],
    step: int,
    rows: pl.DataFrame,
    joins: Mapping[str, Join],
    point_min: float,
) -> Segment:
    wide = max(1, round(point_min * 60_000 / step)) * step
    anchor = int(local[0])
    if wide > step:
        if _DAY_MS % wide == 0:
            anchor -= anchor % wide  # points start on the round clock
        slot = (local - anchor) // wide
        rows = (
            rows.with_columns(slot=pl.Series(slot))
            .group_by("slot", maintain_order=True)
            .agg([join.expression(name) for name, join in joins.items()])
        )
        slot = rows["slot"].to_numpy()
    else:
        slot = np.rint((local - anchor) / wide).astype(np.int64)
    length = int(slot.max()) + 1
    values = {}
    for name in joins:
        column = np.full(length, np.nan, np.float32)
        column[slot] = rows[name].cast(pl.Float32).fill_null(float("nan")).to_numpy()
        values[name] = column
    return Segment(_EPOCH + timedelta(milliseconds=anchor), wide, values)


def stride(count: int, most: int, per_day: int) -> int:
    """Return the step that takes at most `most` of `count` rows and visits every hour.

    Parameters
    ----------
    count, most : int
        Rows there are and rows wanted.
    per_day : int
        Rows a day; the step shares no factor with it, else only some hours would be seen.
    """
    step = max(1, -(-count // most))
    while step > 1 and np.gcd(step, per_day) != 1:
        step += 1
    return step
