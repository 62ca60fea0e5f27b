"""Time zones as tables of transitions, from the tzdata package.

Instants are int64 microseconds since 1970 UTC, offsets int64 minutes east of UTC. The
operating system's zone files are not used: they differ between machines.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from functools import lru_cache
from importlib import resources
from zoneinfo import ZoneInfo

import numpy as np
import numpy.typing as npt

__all__ = [
    "MICROSECONDS_PER_MINUTE",
    "IntArray",
    "ZoneTable",
    "site_zone",
    "zone_over",
    "zone_table",
]

IntArray = npt.NDArray[np.int64]

MICROSECONDS_PER_MINUTE = 60_000_000
_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)


@dataclass(frozen=True)
class ZoneTable:
    """Offsets of one zone over a span of years.

    Attributes
    ----------
    start : IntArray
        Instant from which each offset holds; the first lies before the span.
    offset_min : IntArray
        Minutes east of UTC from that instant on.
    """

    start: IntArray
    offset_min: IntArray

    def offset_at(self, utc: IntArray) -> IntArray:
        """Minutes east of UTC at each instant."""
        return self.offset_min[np.searchsorted(self.start, utc, side="right") - 1]

    def standard_offset_at(self, utc: IntArray) -> IntArray:
        """Minutes east of UTC of the clock that is never put forward.

        Notes
        -----
        The least offset in force in the same calendar year: summer time is the larger
        one on both hemispheres, whatever sign a zone file gives it.
        """
        years = utc.astype("datetime64[us]").astype("datetime64[Y]")
        result = np.empty(len(utc), dtype=np.int64)
        for year in np.unique(years):
            first = np.int64(year.astype("datetime64[us]").astype(np.int64))
            last = np.int64((year + 1).astype("datetime64[us]").astype(np.int64))
            within = (self.start < last) & (np.append(self.start[1:], last + 1) > first)
            result[years == year] = self.offset_min[within].min()
        return result


@lru_cache(maxsize=64)
def site_zone(name: str) -> ZoneInfo:
    """The zone of that IANA name, as the tzdata package has it."""
    *folders, leaf = name.split("/")
    place = resources.files("tzdata").joinpath("zoneinfo", *folders, leaf)
    with place.open("rb") as zone_file:
        return ZoneInfo.from_file(zone_file, key=name)


@lru_cache(maxsize=64)
def zone_table(name: str, first_year: int, last_year: int) -> ZoneTable:
    """Every change of offset from one year before to one year after the span.

    Parameters
    ----------
    name : str
        IANA name.
    first_year, last_year : int
        Years that the readings touch.

    Returns
    -------
    ZoneTable
        Exact to the second of each transition.

    Notes
    -----
    Days whose ends have different offsets are halved down to the transition.
    """
    zone = site_zone(name)
    step = timedelta(days=1)
    instant = datetime(max(first_year - 1, 2), 1, 1, tzinfo=UTC)
    end = datetime(min(last_year + 2, 9998), 1, 1, tzinfo=UTC)
    offset = _offset(zone, instant)
    starts, offsets = [instant], [offset]
    while instant < end:
        following = _offset(zone, instant + step)
        if following != offset:
            starts.append(_transition(zone, instant, instant + step))
            offsets.append(following)
            offset = following
        instant += step
    return ZoneTable(
        np.array([(s - _EPOCH) // timedelta(microseconds=1) for s in starts], dtype=np.int64),
        np.array([o // timedelta(minutes=1) for o in offsets], dtype=np.int64),
    )


def zone_over(name: str, start: IntArray) -> ZoneTable:
    """The table of a zone that covers these instants."""
    if len(start) == 0:
        return zone_table(name, 2000, 2000)
    ends = np.array([start.min(), start.max()]).astype("datetime64[us]").astype("datetime64[Y]")
    first, last = (ends.astype(int) + 1970).tolist()
    return zone_table(name, first, last)


def _offset(zone: ZoneInfo, instant: datetime) -> timedelta:
    return instant.astimezone(zone).utcoffset() or timedelta(0)


def _transition(zone: ZoneInfo, before: datetime, after: datetime) -> datetime:
    old = _offset(zone, before)
    while after - before > timedelta(seconds=1):
        middle = before + (after - before) // 2
        middle = middle.replace(microsecond=0)
        if _offset(zone, middle) == old:
            before = middle
        else:
            after = middle
    return after
