"""The user's own questions to the store, and views written to files."""

from __future__ import annotations

from contextlib import suppress
from difflib import get_close_matches
from pathlib import Path
from typing import Any

import duckdb

from meterlens.errors import RequestError
from meterlens.store.database import Store
from meterlens.store.query_files import load_query, query_names

__all__ = ["VIEWS", "answer", "write_view"]

VIEWS = (
    "interval",
    "interval_power",
    "interval_impedance",
    "interval_balance",
    "demand",
    "month",
    "period",
    "reject",
    "file",
    "history",
)

#: Columns that order a view's rows, so that the same store gives the same file.
_ORDER = ("service", "month", "start_utc", "kind", "file_id", "line", "column")
_WRITTEN = ("schema/", "ingest/")


def answer(
    store: Store, question: str, parameters: dict[str, str]
) -> tuple[list[str], list[tuple[Any, ...]]]:
    """Columns and rows of a shipped query, a view, or the user's SQL.

    Parameters
    ----------
    store : Store
        Open read-only.
    question : str
        A query's name (``month/sums``), a view's name, or SQL.
    parameters : dict of str to str
        Values of the shipped query's parameters; those not given are null.

    Raises
    ------
    RequestError
        No such query, a parameter it does not have, or SQL that cannot run.
    """
    text = question.strip()
    if text in VIEWS:
        relation = _ordered(store, text)
        return relation.columns, relation.fetchall()
    if " " not in text and "\n" not in text:
        return _shipped(store, text, parameters)
    if parameters:
        raise RequestError("--set is for shipped queries; write the values into the SQL")
    # The store's file stays readable; nothing else on the machine is.
    store.con.execute("set enable_external_access = false")
    return store.ask(text)


def _shipped(
    store: Store, name: str, parameters: dict[str, str]
) -> tuple[list[str], list[tuple[Any, ...]]]:
    shipped = [n for n in query_names() if not n.startswith(_WRITTEN)]
    if name not in shipped:
        near = get_close_matches(name, [*VIEWS, *shipped], n=3, cutoff=0.3)
        raise RequestError(
            f'there is no view or shipped query "{name}"',
            hint="Nearest: " + ", ".join(near or VIEWS) + ".",
        )
    query = load_query(name)
    unknown = set(parameters) - set(query.parameters)
    if unknown:
        raise RequestError(
            f"{name} has no parameter {sorted(unknown)[0]}",
            hint="Its parameters: " + (", ".join(query.parameters) or "none") + ".",
        )
    values = {key: parameters.get(key) for key in query.parameters}
    if "service" in values and values["service"] is None:
        raise RequestError(
            f"{name} needs a service",
            hint="Give --set service=ID; ids: "
            + ", ".join(s.id for s in store.site.services)
            + ".",
        )
    rows = store.rows(name, **values)
    columns = list(rows[0]) if rows else []
    return columns, [tuple(row.values()) for row in rows]


def _ordered(store: Store, view: str) -> duckdb.DuckDBPyRelation:
    relation = store.con.view(view)
    keys = [duckdb.ColumnExpression(name) for name in _ORDER if name in relation.columns]
    return relation.sort(*keys)


def write_view(store: Store, view: str, out: Path) -> int:
    """Write a view to a .csv or .parquet file; returns the number of rows.

    Raises
    ------
    RequestError
        No such view, an ending that is neither, or a folder that cannot be written.
    """
    if view not in VIEWS:
        near = get_close_matches(view, VIEWS, n=3, cutoff=0.3)
        raise RequestError(
            f'there is no view "{view}"', hint="Views: " + ", ".join(near or VIEWS) + "."
        )
    ending = out.suffix.lower()
    if ending not in (".csv", ".parquet"):
        raise RequestError(f'cannot write "{ending}" files', file=out, hint="Use .csv or .parquet.")
    relation = _ordered(store, view)
    unfinished = out.with_name(out.name + ".part")
    try:
        out.parent.mkdir(parents=True, exist_ok=True)
        if ending == ".csv":
            relation.write_csv(str(unfinished), header=True)
        else:
            relation.write_parquet(str(unfinished), compression="zstd")
        unfinished.replace(out)
    except (OSError, duckdb.Error) as error:
        with suppress(OSError):
            unfinished.unlink(missing_ok=True)
        first = str(error).strip().splitlines()[0]
        raise RequestError(f"cannot be written ({first})", file=out) from None
    row = relation.aggregate("count(*)").fetchall()
    return int(row[0][0])
