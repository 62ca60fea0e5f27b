"""One export's lines, split and converted by the database."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import duckdb
import pyarrow as pa

from meterlens.errors import ExportError
from meterlens.settings import ColumnMap, Service
from meterlens.store.columns import NUMBER, STORE_COLUMN
from meterlens.store.export_rows import ExportRows
from meterlens.store.export_text import ExportText
from meterlens.store.judging import RowJudge
from meterlens.store.layout import Layout, find_layout
from meterlens.store.query_files import load_query

__all__ = ["column_map_of", "read_rows"]


def read_rows(
    con: duckdb.DuckDBPyConnection, text: ExportText, service: Service, zone_name: str
) -> ExportRows:
    """Read one opened export by its service's column map.

    Parameters
    ----------
    con : DuckDBPyConnection
        Any connection; nothing is stored.
    text : ExportText
        The opened export.
    service : Service
        With its column map.
    zone_name : str
        IANA name of the site's zone.

    Returns
    -------
    ExportRows

    Raises
    ------
    ExportError
        The file cannot be read at all: a mapped column missing, a time format that reads
        no row, an interval length that cannot be told.
    """
    columns = column_map_of(service, text.file)
    layout = find_layout(text, columns)
    table = _printed_rows(con, text, layout, columns)
    return RowJudge(con, text, layout, columns).rows(table, zone_name)


def column_map_of(service: Service, file: Path) -> ColumnMap:
    """The service's column map; an error where it has none."""
    if service.columns is None:
        raise ExportError(
            f'service "{service.id}" has no column map',
            file=file,
            hint="Add [service.columns] to site.toml.",
        )
    return service.columns


def _printed_rows(
    con: duckdb.DuckDBPyConnection, text: ExportText, layout: Layout, columns: ColumnMap
) -> pa.Table:
    for function in ("ingest/printed_number", "ingest/lead_lag_sense"):
        con.execute(load_query(function).text)
    formats = layout.time_formats
    numeric = [word for word in columns.missing if NUMBER.fullmatch(word.strip())]
    parameters: dict[str, Any] = {key: layout.value_fields.get(key) for key in STORE_COLUMN}
    parameters |= {
        "path": str(text.lines_path),
        "delimiter": layout.delimiter,
        "time_field": layout.time_fields[0],
        "time_field_2": layout.time_fields[1] if len(layout.time_fields) > 1 else None,
        "time_format": list(formats),
        "offset_rule": layout.offset_rule,
        "is_epoch": formats == ("epoch",),
        "decimal_mark": layout.decimal,
        "grouped_pattern": layout.grouped_pattern,
        "thousands_mark": layout.thousands,
        "doubtful": text.has_underscore,
        "missing_number": numeric,
    }
    wanted = ["field_count", "printed_us", *layout.value_fields]
    try:
        relation = con.sql(load_query("ingest/printed_row").text, params=parameters)
        return relation.select(*map(duckdb.ColumnExpression, wanted)).to_arrow_table()
    except duckdb.Error as error:
        raise ExportError(
            f"cannot be read as lines of text ({_first_line(error)})", file=text.file
        ) from None


def _first_line(error: Exception) -> str:
    return str(error).strip().splitlines()[0]
