"""What the planted things amount to, judged from the true phasors.

Written from the definitions, apart from the program: a plain evaluation of each rule,
which finds its runs in the record. Everything it finds must be a planted thing.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from generator.circuit import NOMINAL_LN_V, A, Floats, Record
from generator.clock import Mask


@dataclass(frozen=True)
class Rule:
    """When a run of intervals begins and ends, and how long it must last.

    Attributes
    ----------
    unit : str
        Unit of the magnitude.
    enter, leave : float
        The run begins where the magnitude passes `enter` and ends where it is back at
        `leave`.
    below : bool
        Whether passing means falling below.
    floor : float
        Least share of the rating that the largest phase current must carry.
    minutes : int
        The shortest run that counts.
    """

    unit: str
    enter: float
    leave: float
    below: bool
    floor: float
    minutes: int


RULES = {
    "low-pf": Rule("1", 0.95, 0.96, True, 0.10, 60),
    "leading": Rule("1", 0.98, 0.99, True, 0.02, 60),
    "current-imbalance": Rule("1", 0.10, 0.08, False, 0.30, 60),
    "voltage-imbalance": Rule("1", 0.02, 0.02, False, 0.0, 60),
    "voltage": Rule("pu", 0.10, 0.10, False, 0.0, 15),
    "overload": Rule("A", 0.0, 0.0, False, 0.0, 15),
}


def magnitude(record: Record, kind: str) -> Floats:
    """Return a rule's magnitude in every interval, from the phasors.

    `voltage` is the largest distance from nominal, per unit; `voltage-imbalance` is
    |V2|/|V1| of the magnitudes taken 120° apart, as a reader without angles must.
    """
    if kind in ("low-pf", "leading"):
        s = (record.v * np.conj(record.i)).sum(axis=0)
        wanted = s.imag >= 0.0 if kind == "low-pf" else s.imag < 0.0
        return np.where(wanted, s.real / np.abs(s), 1.0)
    if kind == "current-imbalance":
        amperes = np.abs(record.i)
        mean = amperes.mean(axis=0)
        return np.asarray(np.abs(amperes - mean).max(axis=0) / mean)
    volts = np.abs(record.v)
    if kind == "voltage-imbalance":
        negative = np.abs(volts[0] + A * volts[1] + A * A * volts[2])
        return np.asarray(negative / volts.sum(axis=0))
    if kind == "voltage":
        return np.asarray(np.abs(volts / NOMINAL_LN_V - 1.0).max(axis=0))
    return np.asarray(np.abs(record.i).max(axis=0))


def runs(record: Record, kind: str) -> list[tuple[int, int]]:
    """Return the runs of a rule as (first, last + 1) positions in the record."""
    rule = RULES[kind]
    size = magnitude(record, kind)
    enter, leave = (record.rating_a,) * 2 if kind == "overload" else (rule.enter, rule.leave)
    carries = np.abs(record.i).max(axis=0) >= rule.floor * record.rating_a
    sign = -1.0 if rule.below else 1.0
    begins: Mask = (sign * size > sign * enter) & carries
    stays: Mask = (sign * size > sign * leave) & carries
    found: list[tuple[int, int]] = []
    first: int | None = None
    for index in range(len(record.grid) + 1):
        inside = index < len(record.grid) and bool(begins[index] if first is None else stays[index])
        if inside and first is None:
            first = index
        elif not inside and first is not None:
            if (index - first) * record.grid.interval_min >= rule.minutes:
                found.append((first, index))
            first = None
    return found


def worst(record: Record, kind: str, inside: Mask) -> float:
    """Return the worst magnitude within a span: per unit itself for `voltage`."""
    if kind == "voltage":
        return float(np.abs(record.v[:, inside]).min() / NOMINAL_LN_V)
    size = magnitude(record, kind)[inside]
    return float(size.min() if RULES[kind].below else size.max())


def mean(record: Record, kind: str, inside: Mask) -> float:
    """Return the plain mean of the magnitude within a span."""
    if kind == "voltage":
        return float(np.abs(record.v[:, inside]).mean() / NOMINAL_LN_V)
    return float(magnitude(record, kind)[inside].mean())
