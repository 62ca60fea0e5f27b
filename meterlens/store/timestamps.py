"""From printed stamps to the UTC start of each interval.

A printed stamp is a naive clock reading. What it means depends on the clock of the map
(local with summer time, local standard, UTC) and on whether it marks the interval's start
or its end. The *printed* instant is converted first and the interval subtracted after, so
that an end stamp on the very instant of a clock change stays valid.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from meterlens.store.zones import MICROSECONDS_PER_MINUTE, IntArray, ZoneTable, zone_table

__all__ = [
    "NOT_A_TIME",
    "StampReading",
    "file_direction",
    "infer_interval_min",
    "read_stamps",
]

NOT_A_TIME = np.iinfo(np.int64).min

OUTCOME_REASONS = {
    1: "this local time does not exist: the clock was put forward over it",
    2: "this local time came twice and the neighbouring rows do not tell which it is",
}


@dataclass(frozen=True)
class StampReading:
    """The printed stamps of a file, read.

    Attributes
    ----------
    start_utc : IntArray
        Start of each interval, microseconds since 1970 UTC; `NOT_A_TIME` where the local
        time does not exist or cannot be told from its twin.
    fault : ndarray of uint8
        0, or a key of `OUTCOME_REASONS`.
    """

    start_utc: IntArray
    fault: npt.NDArray[np.uint8]


def infer_interval_min(printed: IntArray) -> float | None:
    """The commonest step between neighbouring rows, in minutes.

    Parameters
    ----------
    printed : IntArray
        Printed stamps in file order, microseconds.

    Returns
    -------
    float or None
        None where there are not two different stamps.
    """
    steps = np.abs(np.diff(printed[:200_000]))
    steps = steps[steps > 0]
    if len(steps) == 0:
        return None
    values, counts = np.unique(steps, return_counts=True)
    return float(values[np.argmax(counts)]) / MICROSECONDS_PER_MINUTE


def file_direction(printed: IntArray) -> int:
    """+1 where the file runs forward in time, -1 where it is newest first."""
    steps = np.diff(printed)
    return -1 if np.count_nonzero(steps < 0) > np.count_nonzero(steps > 0) else 1


def read_stamps(
    printed: IntArray, clock: str, stamp: str, zone_name: str, interval_min: int
) -> StampReading:
    """UTC start of each interval from its printed stamp.

    Parameters
    ----------
    printed : IntArray
        Printed stamps in file order as naive microseconds since 1970 (for the clocks
        ``utc`` and ``offset``, already UTC).
    clock : str
        ``local``, ``local-standard``, ``utc`` or ``offset``.
    stamp : str
        ``start`` or ``end``.
    zone_name : str
        IANA name of the site's zone.
    interval_min : int
        Length of the intervals, minutes.

    Returns
    -------
    StampReading
        One entry a row.
    """
    fault = np.zeros(len(printed), dtype=np.uint8)
    step = interval_min * MICROSECONDS_PER_MINUTE
    if clock in ("utc", "offset") or len(printed) == 0:
        instant = printed.copy()
    else:
        years = np.array([printed.min(), printed.max()]).astype("datetime64[us]")
        first, last = (years.astype("datetime64[Y]").astype(int) + 1970).tolist()
        table = zone_table(zone_name, first, last)
        if clock == "local-standard":
            instant = printed - table.standard_offset_at(printed) * MICROSECONDS_PER_MINUTE
        else:
            instant, fault = _from_local(printed, table, step, stamp == "end")
    if stamp == "end":
        instant = np.where(instant == NOT_A_TIME, NOT_A_TIME, instant - step)
    return StampReading(instant, fault)


def _from_local(
    printed: IntArray, table: ZoneTable, step: int, end_stamps: bool
) -> tuple[IntArray, npt.NDArray[np.uint8]]:
    """Local readings to UTC; the few rows in a repeated hour go by continuity."""
    shift = table.offset_min * MICROSECONDS_PER_MINUTE
    segment = np.searchsorted(table.start + shift, printed, side="right") - 1
    segment = np.maximum(segment, 0)
    late = printed - shift[segment]
    until = np.append(table.start[1:], np.iinfo(np.int64).max)[segment]
    fault = np.zeros(len(printed), dtype=np.uint8)
    # The clock's last reading before it is put forward is the transition instant itself:
    # an interval may end on it, none can start with it.
    skipped = late > until if end_stamps else late >= until
    early = printed - shift[np.maximum(segment - 1, 0)]
    begun = table.start[segment]
    repeated = (early <= begun if end_stamps else early < begun) & (segment > 0)
    # At the very end of the repeated hour only an end stamp has an earlier twin, and
    # nearly every export prints it as the plain time: that is kept unless the rows
    # around it say otherwise.
    edge = repeated & (early == begun)
    instant = np.where(skipped, NOT_A_TIME, late)
    fault[skipped] = 1
    if repeated.any():
        chosen = _by_continuity(instant, early, late, repeated, step * file_direction(printed))
        undecided = chosen == NOT_A_TIME
        chosen = np.where(undecided & edge, late, chosen)
        instant = np.where(repeated, chosen, instant)
        fault[repeated & (chosen == NOT_A_TIME)] = 2
    return instant, fault


def _by_continuity(
    instant: IntArray, early: IntArray, late: IntArray, repeated: npt.NDArray[np.bool_], step: int
) -> IntArray:
    """Which of its two instants each repeated stamp is, by the rows around it.

    `step` is signed: negative for a file that runs backward. Three rounds: forward from
    the last decided row, backward from the next one, and the place where the printed
    clock falls back inside a run of undecided rows.
    """
    chosen = np.where(repeated, NOT_A_TIME, instant)
    rows = np.flatnonzero(repeated)
    breaks = np.flatnonzero(np.diff(rows) > 1) + 1
    for run in np.split(rows, breaks):
        before, after = int(run[0]) - 1, int(run[-1]) + 1
        _decide_in_turn(run, before, chosen, early, late, step)
        _decide_in_turn(run[::-1], after, chosen, early, late, -step)
        if (chosen[run] == NOT_A_TIME).any():
            _decide_by_fall(run, chosen, early, late, step)
    return chosen


def _decide_in_turn(
    run: IntArray, neighbour: int, chosen: IntArray, early: IntArray, late: IntArray, step: int
) -> None:
    """Decide rows that stand one interval on from the last decided row before them."""
    last = chosen[neighbour] if 0 <= neighbour < len(chosen) else NOT_A_TIME
    for row in run:
        if chosen[row] == NOT_A_TIME and last != NOT_A_TIME:
            expected = last + step
            if expected in (early[row], late[row]):
                chosen[row] = expected
        if chosen[row] != NOT_A_TIME:
            last = chosen[row]


def _decide_by_fall(
    run: IntArray, chosen: IntArray, early: IntArray, late: IntArray, step: int
) -> None:
    """Use the one place where the printed clock runs against the file's direction."""
    forward = np.sign(step)
    falls = np.flatnonzero(np.diff(late[run]) * forward < 0)
    if len(falls) != 1:
        return
    first, second = run[: falls[0] + 1], run[falls[0] + 1 :]
    before, after = (first, second) if forward > 0 else (second, first)
    for rows, instants in ((before, early), (after, late)):
        undecided = rows[chosen[rows] == NOT_A_TIME]
        chosen[undecided] = instants[undecided]
