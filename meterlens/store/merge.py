"""What becomes of each row of a file: stored, replaced, duplicate or rejected.

Rows meet the store in the order of their lines. A missing value never erases a stored
one; the later line wins; every version that is written over is kept.
"""

from __future__ import annotations

from bisect import bisect_left, insort
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
import numpy.typing as npt

from meterlens.store.columns import READING_COLUMNS
from meterlens.store.rows import UNCONTESTED, Rows, Superseded, given_bits
from meterlens.store.zones import MICROSECONDS_PER_MINUTE, IntArray

__all__ = ["Merge", "Outcome", "merge_rows"]


class Outcome(IntEnum):
    """What became of a row; the four always add up to the rows read."""

    STORED = 0
    REPLACED = 1
    DUPLICATE = 2
    REJECTED = 3


@dataclass
class Merge:
    """The outcome of a file.

    Attributes
    ----------
    outcome : ndarray of int8
        Shape (n,): an `Outcome` for each incoming row, in its order.
    written : Rows
        Rows to write, in order of start.
    rewritten_start : IntArray
        Starts of stored rows that `written` takes the place of.
    superseded : Superseded
    repeated : Rows
        Duplicate rows of another file than the one whose row they repeat.
    """

    outcome: npt.NDArray[np.int8]
    written: Rows
    rewritten_start: IntArray
    superseded: Superseded
    repeated: Rows


def merge_rows(stored: Rows, incoming: Rows) -> Merge:
    """Let the rows of one file meet the stored rows.

    Parameters
    ----------
    stored : Rows
        Stored rows of the service that the file may touch, in order of start.
    incoming : Rows
        The file's rows in order of line, of one interval length.

    Returns
    -------
    Merge

    Notes
    -----
    The rows of one start are met in rounds, the first line of every start in the first
    round, so that a file without repeats is one round of whole-array work.
    """
    outcome = np.full(len(incoming.start), Outcome.STORED, dtype=np.int8)
    if len(stored.start) == 0 and (orderly := _all_new(incoming)) is not None:
        none = np.empty(0, dtype=np.int64)
        nothing = Rows.empty(incoming.names)
        return Merge(outcome, orderly, none, _joined([], incoming.names), nothing)
    names = tuple(n for n in READING_COLUMNS if n in incoming.names or n in stored.names)
    stored, incoming = stored.with_columns(names), incoming.with_columns(names)
    rejected = _overlapping(stored, incoming)
    outcome[rejected] = Outcome.REJECTED
    taken = np.flatnonzero(~rejected)
    order = taken[np.argsort(incoming.start[taken], kind="stable")]
    start = incoming.start[order]
    first = np.append(True, start[1:] != start[:-1]) if len(start) else np.empty(0, bool)
    slots = start[first]
    slot_of = np.cumsum(first) - 1
    rank = np.arange(len(start)) - np.flatnonzero(first)[slot_of] if len(start) else slot_of
    state, occupied = _initial_state(stored, incoming, slots)
    was_stored = occupied.copy()
    dirty = np.zeros(len(slots), dtype=bool)
    versions: list[Superseded] = []
    repeats: list[Rows] = []
    for turn in range(int(rank.max()) + 1 if len(rank) else 0):
        chosen = rank == turn
        rows, slot = incoming.take(order[chosen]), slot_of[chosen]
        result = _meet(state, occupied, dirty, rows, slot, versions, repeats)
        outcome[order[chosen]] = result
    return Merge(
        outcome=outcome,
        written=state.take(dirty),
        rewritten_start=slots[dirty & was_stored],
        superseded=_joined(versions, names),
        repeated=Rows.joined(repeats, names),
    )


def _all_new(incoming: Rows) -> Rows | None:
    """The rows in order of start, where none repeats or overlaps another; else None.

    Nearly every export read for the first time is such a file, forward or backward.
    """
    if len(incoming.start) == 0:
        return incoming
    if len(incoming.start) > 1 and incoming.start[1] < incoming.start[0]:
        incoming = incoming.take(slice(None, None, -1))
    steps = np.diff(incoming.start)
    apart = (steps >= incoming.interval_min[:-1] * MICROSECONDS_PER_MINUTE).all()
    return incoming if apart else None


def _initial_state(
    stored: Rows, incoming: Rows, slots: IntArray
) -> tuple[Rows, npt.NDArray[np.bool_]]:
    """One place for every start of the file, filled with what the store has."""
    count, names = len(slots), incoming.names
    state = Rows(
        start=slots.copy(),
        interval_min=np.zeros(count, dtype=np.int64),
        file_id=np.zeros(count, dtype=np.int64),
        line=np.zeros(count, dtype=np.int64),
        given=np.full(count, UNCONTESTED, dtype=np.int64),
        names=names,
        values=np.full((len(names), count), np.nan),
    )
    occupied = np.zeros(count, dtype=bool)
    if len(stored.start) and count:
        place = np.searchsorted(slots, stored.start)
        place = np.minimum(place, count - 1)
        match = slots[place] == stored.start
        _assign(state, place[match], stored.take(match))
        occupied[place[match]] = True
    return state, occupied


def _assign(state: Rows, slot: IntArray, rows: Rows) -> None:
    state.interval_min[slot] = rows.interval_min
    state.file_id[slot] = rows.file_id
    state.line[slot] = rows.line
    state.given[slot] = rows.given
    state.values[:, slot] = rows.values


def _meet(
    state: Rows,
    occupied: npt.NDArray[np.bool_],
    dirty: npt.NDArray[np.bool_],
    rows: Rows,
    slot: IntArray,
    versions: list[Superseded],
    repeats: list[Rows],
) -> npt.NDArray[np.int8]:
    """One row a start against what stands there; returns the outcomes."""
    result = np.full(len(slot), Outcome.STORED, dtype=np.int8)
    fresh = ~occupied[slot]
    _assign(state, slot[fresh], rows.take(fresh))
    occupied[slot[fresh]] = True
    dirty[slot[fresh]] = True
    if fresh.all():
        return result
    meeting = np.flatnonzero(~fresh)
    rows, slot = rows.take(meeting), slot[meeting]
    old = state.take(slot)
    has_new, has_old = ~np.isnan(rows.values), ~np.isnan(old.values)
    changes = (has_new & has_old & (rows.values != old.values)).any(axis=0)
    fills = (has_new & ~has_old).any(axis=0)
    touched = changes | fills
    result[meeting[changes]] = Outcome.REPLACED
    result[meeting[~touched]] = Outcome.DUPLICATE
    versions.append(
        Superseded(old.take(touched), rows.file_id[touched], rows.line[touched], changes[touched])
    )
    repeats.append(rows.take(~touched & (old.file_id != rows.file_id)))
    rows.given = given_bits(rows)
    rows.values = np.where(has_new, rows.values, old.values)
    _assign(state, slot[touched], rows.take(touched))
    dirty[slot[touched]] = True
    return result


def _joined(versions: list[Superseded], names: tuple[str, ...]) -> Superseded:
    none = np.empty(0, dtype=np.int64)
    return Superseded(
        Rows.joined([v.rows for v in versions], names),
        np.concatenate([none, *(v.by_file_id for v in versions)]),
        np.concatenate([none, *(v.by_line for v in versions)]),
        np.concatenate([none.astype(bool), *(v.replaced for v in versions)]),
    )


def _overlapping(stored: Rows, incoming: Rows) -> npt.NDArray[np.bool_]:
    """Rows that would lie over another interval with another start or another length.

    Only rows near such a neighbour are looked at one by one, in order of line: the
    earlier line holds the place.
    """
    rejected = np.zeros(len(incoming.start), dtype=bool)
    start = np.concatenate([stored.start, incoming.start])
    length = np.concatenate([stored.interval_min, incoming.interval_min])
    length = length * MICROSECONDS_PER_MINUTE
    order = np.argsort(start, kind="stable")
    begin, end = start[order], np.maximum.accumulate((start + length)[order])
    differs = begin[1:] != begin[:-1]
    clash = (differs & (begin[1:] < end[:-1])) | (
        ~differs & (length[order][1:] != length[order][:-1])
    )
    if not clash.any():
        return rejected
    near = np.append(False, clash) | np.append(clash, False)
    # A whole cluster of starts is judged together.
    cluster = np.isin(start, begin[near])
    count = len(stored.start)
    places = sorted((int(s), int(n)) for s, n in zip(stored.start, length[:count], strict=True))
    for row in np.flatnonzero(~cluster[count:]):
        places.append((int(incoming.start[row]), int(length[count + row])))
    places = sorted(set(places))
    for row in np.flatnonzero(cluster[count:]):
        place = (int(incoming.start[row]), int(length[count + row]))
        at = bisect_left(places, place)
        if at < len(places) and places[at] == place:
            continue
        before = at > 0 and places[at - 1][0] + places[at - 1][1] > place[0]
        after = at < len(places) and places[at][0] < place[0] + place[1]
        if before or after:
            rejected[row] = True
        else:
            insort(places, place)
    return rejected
