"""How long the intervals of an export are."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from meterlens.errors import ExportError
from meterlens.settings import ColumnMap
from meterlens.store import timestamps
from meterlens.store.zones import IntArray

__all__ = ["LONGEST_INTERVAL_MIN", "interval_length"]

#: The longest interval that an export may have, minutes.
LONGEST_INTERVAL_MIN = 1440


def interval_length(file: Path, printed: IntArray, columns: ColumnMap) -> int:
    """The length of an export's intervals.

    Parameters
    ----------
    file : Path
        For messages.
    printed : IntArray
        Printed stamps in file order, microseconds.
    columns : ColumnMap

    Returns
    -------
    int
        Minutes: as stated, else the commonest step.

    Raises
    ------
    ExportError
        Most rows share their stamp with the row before, or the length cannot be told, is
        no whole minute, or is longer than a day.
    """
    same = int(np.count_nonzero(np.diff(printed) == 0))
    if same * 2 > len(printed):
        raise ExportError(
            f"{same} of {len(printed)} rows have the same time as the row before",
            file=file,
            key="timestamp",
            hint="Where date and time stand in two columns, name both in timestamp.",
        )
    stated = columns.interval_min
    minutes = stated if stated is not None else timestamps.infer_interval_min(printed)
    if minutes is None:
        raise ExportError(
            "has one time only, so the interval cannot be told",
            file=file,
            key="interval_min",
            hint="Set interval_min in the column map.",
        )
    if minutes < 1 or minutes != round(minutes):
        raise ExportError(
            f"its rows stand {minutes:g} minutes apart; whole minutes are needed",
            file=file,
            key="interval_min",
            hint="Set interval_min in the column map.",
        )
    if minutes > LONGEST_INTERVAL_MIN:
        raise ExportError(
            f"its rows stand {minutes:g} minutes apart; a day ({LONGEST_INTERVAL_MIN}) is the most",
            file=file,
            key="interval_min",
            hint="Export intervals of a day or less, or set interval_min in the column map.",
        )
    return round(minutes)
