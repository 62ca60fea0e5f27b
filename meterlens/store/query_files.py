"""The statements of `queries/`: one file, one statement, found by name."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cache, lru_cache
from pathlib import Path

from meterlens.errors import RequestError

__all__ = ["QueryFile", "load_query", "query_folder", "query_names"]

_PARAMETER = re.compile(r"\$(\w+)")


@dataclass(frozen=True)
class QueryFile:
    """One statement and what its header says of it.

    Attributes
    ----------
    name : str
        ``folder/file`` without the ending.
    text : str
        The statement, without its closing semicolon.
    about, row : str
        What it is; what one row is.
    parameters : tuple of str
        Names of its ``$parameters``.
    """

    name: str
    text: str
    about: str
    parameters: tuple[str, ...]
    row: str


@lru_cache(maxsize=1)
def query_folder() -> Path:
    """The folder of statements: inside the installed package, else beside it."""
    package = Path(__file__).resolve().parent.parent
    inside = package / "queries"
    return inside if inside.is_dir() else package.parent / "queries"


@lru_cache(maxsize=1)
def query_names() -> tuple[str, ...]:
    """Names of all statements, in order."""
    folder = query_folder()
    return tuple(
        sorted(p.relative_to(folder).with_suffix("").as_posix() for p in folder.rglob("*.sql"))
    )


@cache
def load_query(name: str) -> QueryFile:
    """Read one statement.

    Parameters
    ----------
    name : str
        ``folder/file``, as in ``month/peak_demand``.

    Returns
    -------
    QueryFile

    Raises
    ------
    RequestError
        Where there is no such statement.
    """
    if name not in query_names():
        raise RequestError(f"no shipped query is called {name!r}")
    lines = (query_folder() / f"{name}.sql").read_text(encoding="utf-8").splitlines()
    header = [line[2:].strip() for line in lines if line.startswith("--")]
    args = next((h[5:] for h in header if h.startswith("args:")), "")
    row = next((h[4:].strip() for h in header if h.startswith("row:")), "")
    about = " ".join(h for h in header if not h.startswith(("args:", "row:")))
    text = "\n".join(line for line in lines if not line.startswith("--")).strip().rstrip(";")
    return QueryFile(name, text, about, tuple(_PARAMETER.findall(args)), row)
