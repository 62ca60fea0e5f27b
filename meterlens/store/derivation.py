"""From readings to derived columns: the kernel, fed and written back in batches.

The crossing between the store's trade units and the kernel's SI units is here.
"""

from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import fields

import numpy as np
import pyarrow as pa

from meterlens.electrical.conventions import FloatArray, PowerFactorSense
from meterlens.electrical.interval import (
    CURRENT_ANGLE_GRADES,
    VOLTAGE_ANGLE_GRADES,
    IntervalQuantities,
    IntervalReadings,
    ServiceConstants,
    derive_intervals,
)
from meterlens.limits import POWER_MISMATCH
from meterlens.settings import Service
from meterlens.store.columns import (
    DERIVED_FRACTIONS,
    DERIVED_PHASES,
    DERIVED_TOTALS,
    FURTHER_COLUMNS,
    READING_COLUMNS,
    STORE_COLUMN,
    WATTS_PER_KILOWATT,
)
from meterlens.store.rows import UNCONTESTED, Rows
from meterlens.store.zones import ZoneTable

__all__ = ["KERNEL_BATCH", "ROW_GROUP", "derived_batches", "service_constants", "table_schema"]

#: Rows a kernel call: its arrays then stay in cache.
KERNEL_BATCH = 30_720
#: Rows of one DuckDB row group.
ROW_GROUP = 4 * KERNEL_BATCH
_THREADS = 2
_PHASES = "abc"


def service_constants(service: Service) -> ServiceConstants:
    """What the kernel needs of a service's settings."""
    columns = service.columns
    sense = PowerFactorSense("none")
    if columns is not None:
        sense = PowerFactorSense(
            convention=columns.pf_convention,
            assumed={"lagging": 1, "leading": -1, None: 0}[columns.assume],
            lagging_sign=1 if columns.lagging_sign == "positive" else -1,
            per_unit=100.0 if columns.pf_unit == "percent" else 1.0,
        )
    return ServiceConstants(
        sequence=service.phase_sequence,
        nominal_line_v=service.nominal_voltage_v,
        floor_a=service.light_load_fraction * service.rating_a,
        power_factor=sense,
        mismatch_fraction=float(POWER_MISMATCH.value or 0.0),
    )


def _derived_types() -> dict[str, pa.DataType]:
    types: dict[str, pa.DataType] = {}
    for pattern, _, is_double in DERIVED_PHASES.values():
        for phase in _PHASES:
            types[pattern.format(phase)] = pa.float64() if is_double else pa.float32()
    types |= dict.fromkeys(DERIVED_TOTALS.values(), pa.float64())
    types |= dict.fromkeys(DERIVED_FRACTIONS.values(), pa.float32())
    types["angle_grade_code"] = pa.uint8()
    types["current_angle_grade_code"] = pa.uint8()
    types["flag_bits"] = pa.uint16()
    return types


def table_schema(present: tuple[str, ...]) -> pa.Schema:
    """Arrow schema of rows of `reading` with those reading columns that are present."""
    further = []
    if any(name in FURTHER_COLUMNS for name in present):
        further.append(("further", pa.list_(pa.float64())))
    return pa.schema(
        [
            ("service", pa.dictionary(pa.int8(), pa.string())),
            ("start_utc", pa.timestamp("us")),
            ("interval_min", pa.int16()),
            ("utc_offset_min", pa.int16()),
            ("file_id", pa.int32()),
            ("line", pa.int32()),
            ("given", pa.int64()),
            *((name, pa.float64()) for name in present if name not in FURTHER_COLUMNS),
            *further,
            *_derived_types().items(),
        ]
    )


def derived_batches(rows: Rows, service: Service, zone: ZoneTable) -> pa.RecordBatchReader:
    """Rows of the table, derived as they are asked for.

    Parameters
    ----------
    rows : Rows
        Readings in store units, all reading columns, in order of start.
    service : Service
        Whose constants and convention apply.
    zone : ZoneTable
        Offsets of the site's clock over the rows.

    Returns
    -------
    RecordBatchReader
        Whole row groups; the kernel runs ahead on its own threads while the reader's
        consumer writes.
    """
    # A mapped column that is blank all through still is a column: what it means does not
    # depend on how many rows are derived at once.
    mapped = _mapped_columns(service)
    rows = rows.with_columns(
        tuple(name for name in READING_COLUMNS if name in rows.names or name in mapped)
    )
    schema = table_schema(rows.names)
    constants = service_constants(service)

    def batch(first: int) -> pa.RecordBatch:
        part = rows.take(slice(first, first + ROW_GROUP))
        return _record_batch(part, service.id, schema, constants, zone)

    def batches() -> Iterator[pa.RecordBatch]:
        firsts = list(range(0, len(rows.start), ROW_GROUP))
        with ThreadPoolExecutor(_THREADS) as pool:
            ahead = [pool.submit(batch, first) for first in firsts[:_THREADS]]
            for first in firsts[_THREADS:]:
                yield ahead.pop(0).result()
                ahead.append(pool.submit(batch, first))
            for future in ahead:
                yield future.result()

    return pa.RecordBatchReader.from_batches(schema, batches())


def _mapped_columns(service: Service) -> set[str]:
    if service.columns is None:
        return set()
    named = service.columns.value_columns() | service.columns.text_columns()
    return {STORE_COLUMN[key] for key in named if key in STORE_COLUMN}


def _record_batch(
    rows: Rows,
    service_id: str,
    schema: pa.Schema,
    constants: ServiceConstants,
    zone: ZoneTable,
) -> pa.RecordBatch:
    count = len(rows.start)
    arrays: dict[str, pa.Array] = {
        "service": pa.DictionaryArray.from_arrays(
            np.zeros(count, dtype=np.int8), pa.array([service_id])
        ),
        "start_utc": pa.array(rows.start.astype("datetime64[us]")),
        "interval_min": pa.array(rows.interval_min.astype(np.int16)),
        "utc_offset_min": pa.array(zone.offset_at(rows.start).astype(np.int16)),
        "file_id": pa.array(rows.file_id.astype(np.int32)),
        "line": pa.array(rows.line.astype(np.int32)),
        "given": pa.array(rows.given, mask=rows.given == UNCONTESTED),
    }
    column = dict(zip(rows.names, rows.values, strict=True))
    for name, x in column.items():
        if name not in FURTHER_COLUMNS:
            arrays[name] = _array(x)
    if "further" in schema.names:
        arrays["further"] = _further(column, count)
    parts = [
        derive_intervals(_kernel_readings(column, count, slice(k, k + KERNEL_BATCH)), constants)
        for k in range(0, count, KERNEL_BATCH)
    ]
    arrays |= _derived_arrays(parts, count)
    return pa.record_batch([arrays[name] for name in schema.names], schema=schema)


def _further(column: dict[str, FloatArray], count: int) -> pa.Array:
    """The readings that few exports have as one list a row, up to the last that is there."""
    width = 1 + max(k for k, name in enumerate(FURTHER_COLUMNS) if name in column)
    cells = np.full((count, width), np.nan)
    for place, name in enumerate(FURTHER_COLUMNS[:width]):
        if name in column:
            cells[:, place] = column[name]
    offsets = np.arange(0, (count + 1) * width, width, dtype=np.int32)
    return pa.ListArray.from_arrays(pa.array(offsets), _array(cells.ravel()))


def _array(x: FloatArray) -> pa.Array:
    """NaN as null; double or float as given."""
    return pa.array(x, mask=np.isnan(x))


def _kernel_readings(column: dict[str, FloatArray], count: int, part: slice) -> IntervalReadings:
    """Readings in SI units, None where no phase has the column."""
    missing = np.full(len(range(*part.indices(count))), np.nan)

    def phases(pattern: str, names: str, factor: float = 1.0) -> FloatArray | None:
        wanted = [pattern.format(name) for name in names.split()]
        if not any(name in column for name in wanted):
            return None
        stacked = np.stack([column[n][part] if n in column else missing for n in wanted])
        return stacked if factor == 1.0 else stacked * factor

    def total(name: str, factor: float = 1.0) -> FloatArray | None:
        if name not in column:
            return None
        return column[name][part] if factor == 1.0 else column[name][part] * factor

    readings = IntervalReadings(
        v=phases("v_{}", "a b c"),
        i=phases("i_{}", "a b c"),
        pf=phases("pf_exported_{}", "a b c"),
        p=phases("p_metered_{}_kw", "a b c", WATTS_PER_KILOWATT),
        q=phases("q_metered_{}_kvar", "a b c", WATTS_PER_KILOWATT),
        s=phases("s_metered_{}_kva", "a b c", WATTS_PER_KILOWATT),
        v_line=phases("v_{}", "ab bc ca"),
        lead_lag=phases("lead_lag_{}", "a b c"),
        lead_lag_total=total("lead_lag_total"),
        pf_total=total("pf_exported_total"),
        p_total=total("p_metered_kw", WATTS_PER_KILOWATT),
        q_total=total("q_metered_kvar", WATTS_PER_KILOWATT),
        s_total=total("s_metered_kva", WATTS_PER_KILOWATT),
    )
    if all(getattr(readings, f.name) is None for f in fields(readings)):
        # Rows with a metered neutral alone still are intervals.
        return IntervalReadings(v=np.stack([missing] * len(_PHASES)))
    return readings


def _derived_arrays(parts: list[IntervalQuantities], count: int) -> dict[str, pa.Array]:
    """Kernel results of one row group as columns in the store's units."""
    arrays: dict[str, pa.Array] = {}

    def joined(pieces: list[FloatArray], divisor: float, is_double: bool) -> pa.Array:
        x = np.concatenate(pieces) if len(pieces) != 1 else pieces[0]
        x = x if divisor == 1.0 else x / divisor
        return _array(x if is_double else x.astype(np.float32))

    for field, (pattern, divisor, is_double) in DERIVED_PHASES.items():
        for k, phase in enumerate(_PHASES):
            pieces = [getattr(part, field)[k] for part in parts]
            arrays[pattern.format(phase)] = joined(pieces, divisor, is_double)
    for field, name in DERIVED_TOTALS.items():
        arrays[name] = joined([getattr(part, field) for part in parts], WATTS_PER_KILOWATT, True)
    for field, name in DERIVED_FRACTIONS.items():
        arrays[name] = joined([getattr(part, field) for part in parts], 1.0, False)
    angle = VOLTAGE_ANGLE_GRADES.index(parts[0].voltage_angle_grade)
    current = CURRENT_ANGLE_GRADES.index(parts[0].current_angle_grade)
    arrays["angle_grade_code"] = pa.array(np.full(count, angle, dtype=np.uint8))
    arrays["current_angle_grade_code"] = pa.array(np.full(count, current, dtype=np.uint8))
    arrays["flag_bits"] = pa.array(np.concatenate([part.flags for part in parts]))
    return arrays
