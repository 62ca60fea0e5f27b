"""What reading an export gives: its usable rows, and what could not be read."""

from __future__ import annotations

from dataclasses import dataclass, field

from meterlens.electrical.conventions import FloatArray
from meterlens.store.export_text import ExportText
from meterlens.store.zones import IntArray

__all__ = ["ExportRows", "Reject"]


@dataclass(frozen=True)
class Reject:
    """One row (no column) or one value that could not be read.

    Attributes
    ----------
    line : int
        1-based line of the export.
    column : str or None
        Key of the column map, where one value is at fault.
    reason, text : str
        Why, and what stands there.
    """

    line: int
    column: str | None
    reason: str
    text: str


@dataclass
class ExportRows:
    """The usable rows of one export, in the order of its lines.

    Attributes
    ----------
    text : ExportText
        The file and its fingerprint.
    interval_min : int
    rows_read : int
        Non-blank lines after the header and the units row.
    line, start_utc : IntArray
        Shape (n,): 1-based line; start in microseconds since 1970 UTC.
    values : dict of str to FloatArray
        Store column → numbers as printed, scaled; NaN where missing.
    row_rejects, value_rejects : list of Reject
    values_clamped : int
        Power factors up to half a percent above 1.
    notes : list of str
        What was found where the map left it open.
    """

    text: ExportText
    interval_min: int
    rows_read: int
    line: IntArray
    start_utc: IntArray
    values: dict[str, FloatArray]
    row_rejects: list[Reject] = field(default_factory=list)
    value_rejects: list[Reject] = field(default_factory=list)
    values_clamped: int = 0
    notes: list[str] = field(default_factory=list)
