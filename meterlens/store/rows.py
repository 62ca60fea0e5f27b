"""Rows of one service as arrays, between exports, the kernel and the table."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from meterlens.electrical.conventions import FloatArray
from meterlens.store.columns import READING_COLUMNS
from meterlens.store.zones import IntArray

__all__ = ["UNCONTESTED", "Rows", "Superseded", "column_bits", "given_bits"]

#: `given` of a row that no other line has written to: all its values are its own.
UNCONTESTED = -1


@dataclass
class Rows:
    """Rows of one service.

    Attributes
    ----------
    start : IntArray
        Shape (n,), microseconds since 1970 UTC.
    interval_min, file_id, line, given : IntArray
        Shape (n,). `given` has a bit for each value that the line itself gave, or
        `UNCONTESTED`.
    names : tuple of str
        The k reading columns that have values at all, in the order of the table.
    values : FloatArray
        Shape (k, n): one row a reading column, NaN where missing.
    """

    start: IntArray
    interval_min: IntArray
    file_id: IntArray
    line: IntArray
    given: IntArray
    names: tuple[str, ...]
    values: FloatArray

    def take(self, where: npt.NDArray[np.bool_] | IntArray | slice) -> Rows:
        """The chosen rows."""
        return Rows(
            self.start[where],
            self.interval_min[where],
            self.file_id[where],
            self.line[where],
            self.given[where],
            self.names,
            self.values[:, where],
        )

    def with_columns(self, names: tuple[str, ...]) -> Rows:
        """The same rows with exactly these columns; those not there are missing."""
        if names == self.names:
            return self
        values = np.full((len(names), len(self.start)), np.nan)
        for place, name in enumerate(names):
            if name in self.names:
                values[place] = self.values[self.names.index(name)]
        return Rows(
            self.start, self.interval_min, self.file_id, self.line, self.given, names, values
        )

    @staticmethod
    def empty(names: tuple[str, ...] = ()) -> Rows:
        """No rows of these columns."""
        none = np.empty(0, dtype=np.int64)
        return Rows(none, none, none, none, none, names, np.empty((len(names), 0)))

    @staticmethod
    def joined(parts: list[Rows], names: tuple[str, ...]) -> Rows:
        """One after another, all of the same columns."""
        parts = parts or [Rows.empty(names)]
        return Rows(
            np.concatenate([p.start for p in parts]),
            np.concatenate([p.interval_min for p in parts]),
            np.concatenate([p.file_id for p in parts]),
            np.concatenate([p.line for p in parts]),
            np.concatenate([p.given for p in parts]),
            names,
            np.concatenate([p.values for p in parts], axis=1),
        )


@dataclass
class Superseded:
    """Versions written over: the old rows, by which line, and whether a value changed."""

    rows: Rows
    by_file_id: IntArray
    by_line: IntArray
    replaced: npt.NDArray[np.bool_]


def column_bits(names: tuple[str, ...]) -> IntArray:
    """The bit of each column in `given`; shape (k, 1)."""
    places = [READING_COLUMNS.index(name) for name in names]
    return np.left_shift(np.int64(1), np.array(places, dtype=np.int64))[:, None]


def given_bits(rows: Rows) -> IntArray:
    """A bit for each column that has a value; shape (n,)."""
    return np.asarray((~np.isnan(rows.values) * column_bits(rows.names)).sum(axis=0))
