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

from meterlens.store.zones import MICROSECONDS_PER_MINUTE, IntArray, ZoneTable, zone_over

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
    either_way : int
        Rows of a repeated hour that fit both its passes as well, read as the first.
    """

    start_utc: IntArray
    fault: npt.NDArray[np.uint8]
    either_way: int = 0


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
    either_way = 0
    if clock in ("utc", "offset") or len(printed) == 0:
        instant = printed.copy()
    else:
        table = zone_over(zone_name, printed)
        if clock == "local-standard":
            instant = printed - table.standard_offset_at(printed) * MICROSECONDS_PER_MINUTE
        else:
            instant, fault, either_way = _from_local(printed, table, step, stamp == "end")
    if stamp == "end":
        instant = np.where(instant == NOT_A_TIME, NOT_A_TIME, instant - step)
    return StampReading(instant, fault, either_way)


def _from_local(
    printed: IntArray, table: ZoneTable, step: int, end_stamps: bool
) -> tuple[IntArray, npt.NDArray[np.uint8], int]:
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
    either_way = 0
    if repeated.any():
        direction = file_direction(printed)
        order = slice(None, None, direction)
        chosen, either_way = _by_continuity(
            instant[order], early[order], late[order], repeated[order], step
        )
        chosen = chosen[order]
        undecided = chosen == NOT_A_TIME
        chosen = np.where(undecided & edge, late, chosen)
        instant = np.where(repeated, chosen, instant)
        fault[repeated & (chosen == NOT_A_TIME)] = 2
    return instant, fault, either_way


def _by_continuity(
    instant: IntArray, early: IntArray, late: IntArray, repeated: npt.NDArray[np.bool_], step: int
) -> tuple[IntArray, int]:
    """Which of its two instants each repeated stamp is, by the rows around it.

    The arrays run forward in time. Each unbroken run of such rows takes the reading in
    which the fewest rows fail to advance by one interval; of equals, the one that holds
    longest, so that an hour that stands once is its first pass, whichever way the file
    runs. Such rows are counted; a row that fits both ways alike is left undecided.
    """
    chosen = np.where(repeated, NOT_A_TIME, instant)
    rows = np.flatnonzero(repeated)
    either_way = 0
    for run in np.split(rows, np.flatnonzero(np.diff(rows) > 1) + 1):
        either_way += _decide_run(run, chosen, early, late, step)
    return chosen, either_way


#: Steps that are off, then where they are (an earlier one is the higher bit): less is better.
_Misfit = tuple[int, int]


def _decide_run(run: IntArray, chosen: IntArray, early: IntArray, late: IntArray, step: int) -> int:
    """Shortest path through the two readings of each row, from both ends.

    Returns how many rows fit both readings with as few misfits.
    """
    either_way = 0
    count = len(run)
    states = [(int(early[row]), int(late[row])) for row in run]
    before, after = int(run[0]) - 1, int(run[-1]) + 1
    first = int(chosen[before]) if before >= 0 else NOT_A_TIME
    last = int(chosen[after]) if after < len(chosen) else NOT_A_TIME

    def misfit(one: int, following: int, place: int) -> _Misfit:
        if NOT_A_TIME in (one, following) or following - one == step:
            return 0, 0
        backward = following < one
        return 2 if backward else 1, 1 << (count - place)

    def best(options: list[tuple[_Misfit, _Misfit]]) -> _Misfit:
        return min((a[0] + b[0], a[1] | b[1]) for a, b in options)

    forward = [[misfit(first, state, 0) for state in states[0]]]
    for k in range(1, count):
        forward.append(
            [
                best([(forward[-1][s], misfit(states[k - 1][s], to, k)) for s in (0, 1)])
                for to in states[k]
            ]
        )
    onward = [misfit(state, last, count) for state in states[-1]]
    for k in range(count - 1, -1, -1):
        as_early, as_late = (best([(forward[k][s], onward[s])]) for s in (0, 1))
        either_way += as_early != as_late and as_early[0] == as_late[0]
        if as_early != as_late:
            chosen[run[k]] = states[k][0 if as_early < as_late else 1]
        if k:
            onward = [
                best([(misfit(state, states[k][s], k), onward[s]) for s in (0, 1)])
                for state in states[k - 1]
            ]
    return either_way
