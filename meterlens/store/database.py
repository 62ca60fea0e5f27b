"""The store's file: opening, its tables and views, its copy of the settings.

Reading commands open it read-only, so that several can run at once; they open it for
writing only where settings or formulas changed and derived values are stale.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

import duckdb

from meterlens import __version__
from meterlens.errors import RequestError, StoreError, StoreLocked
from meterlens.settings import Site
from meterlens.store import setting_rows
from meterlens.store.query_files import load_query, query_names

if TYPE_CHECKING:
    import polars as pl

__all__ = ["STORE_EDITION", "Store", "open_store"]

#: Layout of tables and views; a store of another edition is ingested anew.
STORE_EDITION = 1

_LOCK = re.compile(r"Conflicting lock is held in (.+?) \(PID (\d+)\)")


class Store:
    """An open store of one site.

    Attributes
    ----------
    site : Site
    con : DuckDBPyConnection
    writable : bool
    """

    def __init__(self, site: Site, con: duckdb.DuckDBPyConnection, writable: bool) -> None:
        self.site, self.con, self.writable = site, con, writable

    def run(self, name: str, /, **parameters: Any) -> None:
        """Run a shipped statement for its effect."""
        self.con.execute(load_query(name).text, parameters or None)

    def rows(self, name: str, /, **parameters: Any) -> list[dict[str, Any]]:
        """Rows of a shipped statement as dictionaries."""
        cursor = self.con.execute(load_query(name).text, parameters or None)
        names = [column[0] for column in cursor.description]
        return [dict(zip(names, row, strict=True)) for row in cursor.fetchall()]

    def frame(self, name: str, /, **parameters: Any) -> pl.DataFrame:
        """Rows of a shipped statement as a polars frame."""
        import polars as pl  # a fifth of a second that only the pages need

        relation = self.con.sql(load_query(name).text, params=parameters or None)
        return pl.DataFrame(pl.from_arrow(relation.to_arrow_table()))

    def ask(self, text: str) -> tuple[list[str], list[tuple[Any, ...]]]:
        """Column names and rows of the user's own SQL.

        Raises
        ------
        RequestError
            Where the statement is not valid, or would write.
        """
        try:
            cursor = self.con.execute(text)
            names = [column[0] for column in cursor.description or []]
            return names, cursor.fetchall() if names else []
        except duckdb.Error as error:
            raise RequestError(f"the query cannot run: {_brief(error)}") from None

    @contextmanager
    def transaction(self) -> Iterator[None]:
        """All or nothing: whatever ends it early leaves the store as it was."""
        self.con.execute("begin transaction")
        try:
            yield
        except BaseException:
            self.con.execute("rollback")
            raise
        self.con.execute("commit")


@contextmanager
def open_store(site: Site, *, write: bool = False) -> Iterator[Store]:
    """Open the site's store, making it where a write is wanted and there is none.

    Parameters
    ----------
    site : Site
    write : bool
        For ingest; reading commands leave it False.

    Raises
    ------
    StoreLocked
        Another process holds the store; the message names its PID.
    StoreError
        There is no store yet, or the file is none, or of another edition.
    """
    path = site.store
    if not write and not path.exists():
        raise StoreError("there is no store yet", file=path, hint='Run "meterlens ingest" first.')
    fresh = not path.exists()
    con = _connect(path, read_only=not write)
    store = Store(site, con, write)
    try:
        _check_edition(store)
        yield store
    finally:
        empty = fresh and _holds_nothing(store)
        con.close()
        if empty:  # a first ingest that stored nothing leaves nothing behind
            path.unlink(missing_ok=True)
            path.with_name(path.name + ".wal").unlink(missing_ok=True)


def _holds_nothing(store: Store) -> bool:
    """True where no file was read into the store; False where it cannot be told."""
    try:
        return not store.rows("ingest/service_with_rows")
    except duckdb.Error:
        return False


def _connect(path: Path, *, read_only: bool) -> duckdb.DuckDBPyConnection:
    try:
        if not read_only:
            path.parent.mkdir(parents=True, exist_ok=True)
        return duckdb.connect(
            str(path), read_only=read_only, config={"autoinstall_known_extensions": "false"}
        )
    except duckdb.Error as error:
        text = str(error)
        if found := _LOCK.search(text):
            raise StoreLocked(
                f"is held by another program (PID {found[2]}, {found[1]})",
                file=path,
                hint="Wait for it to finish, or end it.",
            ) from None
        if "not a valid DuckDB database file" in text:
            raise StoreError(
                "is not a store", file=path, hint="Move it away, then ingest again."
            ) from None
        raise StoreError(f"cannot be opened ({_brief(error)})", file=path) from None
    except OSError as error:
        raise StoreError(f"cannot be made ({error.strerror})", file=path) from None


def _brief(error: Exception) -> str:
    return str(error).strip().split("\n\n")[0].replace("\n", " ")


def _check_edition(store: Store) -> None:
    """Make the tables of a new store; refuse a store of another layout."""
    tables = store.con.execute("select table_name from duckdb_tables()").fetchall()
    names = {row[0] for row in tables}
    if "store_edition" in names:
        row = store.con.execute("select edition, version from store_edition").fetchone()
        store.con.execute("select 1").fetchall()
        if row is not None and row[0] == STORE_EDITION:
            return
        raise StoreError(
            f"was written by another edition of the program ({row[1] if row else '?'})",
            file=store.site.store,
            hint="Move it away, then ingest the exports again.",
        )
    if names:
        raise StoreError(
            "is a database of something else", file=store.site.store, hint="Choose another store."
        )
    if not store.writable:
        raise StoreError(
            "holds no readings yet", file=store.site.store, hint='Run "meterlens ingest" first.'
        )
    with store.transaction():
        create_schema(store)


def create_schema(store: Store) -> None:
    """Tables, functions and views of a new store."""
    schema = [name for name in query_names() if name.startswith("schema/")]
    for kind in ("", "macro_", "view_"):
        for name in schema:
            leaf = name.removeprefix("schema/")
            own = next((k for k in ("macro_", "view_") if leaf.startswith(k)), "")
            if own == kind:
                store.run(name)
    store.con.execute(
        "insert into store_edition values ($edition, $version)",
        {"edition": STORE_EDITION, "version": __version__},
    )


def settings_are_current(store: Store) -> bool:
    """True where the store's copy of the settings equals the site's, for services it has."""
    kept = {row["service"]: row for row in store.rows("ingest/kept_setting")}
    wanted = {row["service"]: row for row in setting_rows.service_rows(store.site)}
    known = {row["service"] for row in store.rows("ingest/service_with_rows")}
    same = all(kept.get(name) == row for name, row in wanted.items() if name in known)
    rules = {(row["service"], row["kind"]): row for row in store.rows("ingest/kept_rule")}
    asked = {
        (row["service"], row["kind"]): row
        for row in setting_rows.rule_rows(store.site)
        if row["service"] in known
    }
    return same and all(rules.get(key) == row for key, row in asked.items())


def stale_services(store: Store) -> list[str]:
    """Services whose derived rows come from other settings or formulas."""
    kept = {row["service"]: row["derivation_digest"] for row in store.rows("ingest/kept_setting")}
    known = {row["service"] for row in store.rows("ingest/service_with_rows")}
    return [
        row["service"]
        for row in setting_rows.service_rows(store.site)
        if row["service"] in known and kept.get(row["service"]) != row["derivation_digest"]
    ]


def write_settings(store: Store) -> None:
    """Bring the store's copy of the settings, and its calendar, up to date."""
    store.run("ingest/clear_setting")
    store.run("ingest/clear_rule")
    store.run("ingest/clear_calendar")
    for row in setting_rows.service_rows(store.site):
        store.run("ingest/add_setting", **row)
    for row in setting_rows.rule_rows(store.site):
        store.run("ingest/add_rule", **row)
    span = store.rows("ingest/record_span")[0]
    if span["first_utc"] is not None:
        months: list[Mapping[str, Any]] = setting_rows.calendar_rows(
            store.site.timezone, span["first_utc"], span["last_utc"]
        )
        for month in months:
            store.run("ingest/add_calendar_month", **month)
