"""The column map: how one meter's export reads."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Literal

from pydantic import BeforeValidator, Field, StringConstraints, field_validator, model_validator

from meterlens.settings import column_map_checks as checks
from meterlens.settings.columns import (
    TEXT_COLUMNS,
    VALUE_COLUMNS,
    ColumnName,
    TextColumns,
    ValueColumns,
)
from meterlens.settings.kinds import Number, Positive, TrueFalse, WholeNumber

__all__ = ["DEFAULT_MISSING", "ColumnMap", "PfConvention"]

PfConvention = Literal[
    "unsigned",
    "sign-is-power-flow",
    "sign-is-lead-lag",
    "quadrant",
    "suffix",
    "from-power",
    "none",
]

DEFAULT_MISSING: tuple[str, ...] = ("", "-", "--", "---", "n/a", "N/A", "NA", "null", "NULL")

Character = Annotated[str, StringConstraints(min_length=1, max_length=1)]


def _as_names(timestamp: object) -> object:
    return timestamp if isinstance(timestamp, list | tuple) else (timestamp,)


class ColumnMap(ValueColumns, TextColumns):
    """How an export reads: its clock, its columns and its spelling of numbers.

    Keys of columns are those of `VALUE_COLUMNS` and `TEXT_COLUMNS`. `interval_min` is in
    minutes. None in `timestamp_format` means ISO 8601; None in `interval_min`,
    `delimiter`, `decimal`, `thousands`, `encoding`, `header_row` and `units_row` means
    that the reader finds out.
    """

    timestamp: Annotated[
        tuple[ColumnName, ...], BeforeValidator(_as_names), Field(min_length=1, max_length=2)
    ]
    timestamp_format: str | None = None
    clock: Literal["local", "local-standard", "utc", "offset"]
    stamp: Literal["start", "end"]
    midnight: Literal["starts-day", "ends-day"] = "starts-day"
    interval_min: Annotated[Positive, Field(le=1440)] | None = None

    pf_convention: PfConvention = "none"
    pf_unit: Literal["fraction", "percent"] = "fraction"
    pf_kind: Literal["true", "displacement"] = "true"
    assume: Literal["lagging", "leading"] | None = None
    lagging_sign: Literal["negative", "positive"] | None = None
    total_pf_kind: Literal["vector", "arithmetic"] = "vector"
    meter_elements: Literal[2, 3] = 3
    thd_base: Literal["fundamental", "rms"] = "fundamental"

    delimiter: Character | None = None
    decimal: Literal[".", ","] | None = None
    thousands: Character | None = None
    encoding: str | None = None
    header_row: WholeNumber | None = None
    units_row: TrueFalse | None = None
    missing: tuple[str, ...] = DEFAULT_MISSING
    estimated: tuple[str, ...] = ()
    scale: Mapping[str, Number] = Field(default_factory=dict)

    _timestamp_format = field_validator("timestamp_format")(checks.timestamp_format)
    _encoding = field_validator("encoding")(checks.encoding)
    _delimiter = field_validator("delimiter")(checks.delimiter)
    _thousands = field_validator("thousands")(checks.thousands)

    @model_validator(mode="after")
    def _agrees(self) -> ColumnMap:
        named = self.value_columns()
        texts = self.text_columns()
        checks.columns(self.timestamp, named, texts, self.header_row)
        checks.numbers(self.decimal, self.thousands)
        checks.scale(self.scale, named)
        checks.clock(self.clock, self.timestamp_format)
        checks.quality("quality" in texts, self.estimated)
        checks.power_factor(
            self.pf_convention if "pf_convention" in self.model_fields_set else None,
            self.assume,
            self.lagging_sign,
            frozenset(named) | frozenset(texts),
        )
        return self

    def value_columns(self) -> dict[str, str | int]:
        """Return the mapped number columns.

        Returns
        -------
        dict of str to str or int
            Key of `VALUE_COLUMNS` → header or 1-based number, in that order.
        """
        return self._mapped(VALUE_COLUMNS)

    def text_columns(self) -> dict[str, str | int]:
        """Return the mapped word columns.

        Returns
        -------
        dict of str to str or int
            Key of `TEXT_COLUMNS` → header or 1-based number, in that order.
        """
        return self._mapped(TEXT_COLUMNS)

    def _mapped(self, keys: tuple[str, ...]) -> dict[str, str | int]:
        every = {key: getattr(self, key) for key in keys}
        return {key: name for key, name in every.items() if name is not None}
