"""The site's clock: interval starts in UTC and what the wall clock shows with them."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta, timezone
from zoneinfo import ZoneInfo

import numpy as np
from numpy.typing import NDArray

TIMEZONE = "Europe/Athens"
ZONE = ZoneInfo(TIMEZONE)
STANDARD = timezone(timedelta(hours=2))
"""The zone's standard time, all year: what a `local-standard` clock shows."""
HOLIDAYS = (date(2026, 10, 28),)
"""Days on which the site works as on a Sunday."""

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]


def instant(local: str) -> datetime:
    """Return the instant of a site-local time written `YYYY-MM-DD HH:MM`, the earlier if two."""
    return datetime.fromisoformat(local).replace(tzinfo=ZONE)


def epoch(local: str) -> int:
    """Return a site-local time as seconds since 1970 (UTC)."""
    return int(instant(local).timestamp())


@dataclass(frozen=True)
class Grid:
    """Interval starts of one record.

    Attributes
    ----------
    interval_min : int
        Length of an interval, in minutes.
    start : ndarray of int64, shape (n,)
        Interval starts, in seconds since 1970 (UTC).
    local : list of datetime
        The same instants on the site's wall clock.
    hour : ndarray, shape (n,)
        Hour of the local day, 0…24, fractions for minutes.
    weekday : ndarray of int64, shape (n,)
        0 is Monday; a holiday counts as 6, Sunday.
    """

    interval_min: int
    start: NDArray[np.int64]
    local: list[datetime]
    hour: Floats
    weekday: NDArray[np.int64]

    def __len__(self) -> int:
        return len(self.local)

    def within(self, first: str, last: str) -> Mask:
        """Return which intervals start within [first, last), both site-local."""
        return np.asarray((self.start >= epoch(first)) & (self.start < epoch(last)))

    def index(self, local: str) -> int:
        """Return the position of the interval that starts at a site-local time."""
        return int(np.flatnonzero(self.start == epoch(local))[0])


def grid(first: str, last: str, interval_min: int) -> Grid:
    """Return the interval starts from `first` up to, not with, `last` (site-local)."""
    start = np.arange(epoch(first), epoch(last), 60 * interval_min, dtype=np.int64)
    local = [datetime.fromtimestamp(second, UTC).astimezone(ZONE) for second in start.tolist()]
    hour = np.array([moment.hour + moment.minute / 60.0 for moment in local])
    weekday = np.array(
        [6 if moment.date() in HOLIDAYS else moment.weekday() for moment in local], dtype=np.int64
    )
    return Grid(interval_min, start, local, hour, weekday)


def by_day(
    times: Grid,
    working: list[tuple[float, float]],
    saturday: list[tuple[float, float]],
    sunday: list[tuple[float, float]],
) -> Floats:
    """Return a daily and weekly rhythm, straight lines between (hour, level) points."""
    level = np.empty(len(times))
    for points, chosen in (
        (working, times.weekday < 5),
        (saturday, times.weekday == 5),
        (sunday, times.weekday == 6),
    ):
        hours, levels = zip(*points, strict=True)
        level[chosen] = np.interp(times.hour[chosen], hours, levels)
    return level
