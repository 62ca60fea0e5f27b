"""One interval through the electrical kernel, from plain lists."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from meterlens.electrical.conventions import Flag, PowerFactorSense
from meterlens.electrical.interval import (
    IntervalQuantities,
    IntervalReadings,
    ServiceConstants,
    derive_intervals,
)

NAN = math.nan
V = [230.0, 230.0, 230.0]
I = [100.0, 100.0, 100.0]  # noqa: E741 - the trade's letter
S = 23_000.0
FLOOR_A = 16.0
Q_AT_09 = S * math.sqrt(1.0 - 0.81)


def interval(
    convention: str = "unsigned",
    assumed: int = 1,
    sequence: str = "abc",
    lagging_sign: int = -1,
    **columns: Any,
) -> IntervalQuantities:
    """Derive one interval: a list of three is a phase column, a number one of totals."""
    shaped = {
        name: np.array(x, dtype=float)[:, None] if isinstance(x, list) else np.array([float(x)])
        for name, x in columns.items()
    }
    sense = PowerFactorSense(convention, assumed, lagging_sign)
    return derive_intervals(
        IntervalReadings(**shaped), ServiceConstants(sequence, 400.0, FLOOR_A, sense)
    )


def words(out: IntervalQuantities) -> Flag:
    return Flag(int(out.flags[0]))


def flat(x: np.ndarray) -> list[float]:
    return [float(value) for value in x.ravel()]
