"""What pydantic found wrong, said in the words of a settings file."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

from pydantic_core import ErrorDetails

from meterlens.settings.column_map import ColumnMap
from meterlens.settings.key_lines import KeyPath
from meterlens.settings.kinds import Settings, nearest
from meterlens.settings.models import PeriodRule, Service, SiteFile, SiteTable, Sum, ZipMix

__all__ = ["reason_and_hint", "where", "without_echoes"]

_TABLES: dict[tuple[str, ...], type[Settings]] = {
    (): SiteFile,
    ("site",): SiteTable,
    ("service",): Service,
    ("service", "columns"): ColumnMap,
    ("service", "zip"): ZipMix,
    ("service", "periods"): PeriodRule,
    ("sum",): Sum,
}
_TYPES = {
    "float_type": "a number without quotes",
    "int_type": "a whole number without quotes",
    "int_from_float": "a whole number",
    "bool_type": "true or false",
    "string_type": "text in quotes",
    "tuple_type": "a list in brackets",
    "mapping_type": "a table",
    "dict_type": "a table",
    "model_type": "a table",
    "finite_number": "a finite number",
}
_TOP_LEVEL = "In a map file the keys stand at the top level."
_BOUNDS = {
    "greater_than": ("above", "gt"),
    "greater_than_equal": ("at least", "ge"),
    "less_than": ("below", "lt"),
    "less_than_equal": ("at most", "le"),
}


def without_echoes(errors: Sequence[ErrorDetails]) -> list[ErrorDetails]:
    """Drop each missing key that only a misspelt key of the same table makes missing.

    Parameters
    ----------
    errors : sequence of ErrorDetails
        Pydantic's errors on a `SiteFile`.

    Returns
    -------
    list of ErrorDetails
    """
    unknown = [where(error) for error in errors if error["type"] == "extra_forbidden"]
    return [
        error
        for error in errors
        if error["type"] != "missing" or not any(_explains(path, where(error)) for path in unknown)
    ]


def _explains(unknown: KeyPath, missing: KeyPath) -> bool:
    if unknown[:-1] != missing[:-1]:
        return False
    hint = _nearest_key(unknown) or ""
    return f'"{missing[-1]}"' in hint or hint == _TOP_LEVEL


def where(error: ErrorDetails) -> KeyPath:
    """Find the path of the key that an error is about.

    Parameters
    ----------
    error : ErrorDetails
        One of pydantic's errors on a `SiteFile`.

    Returns
    -------
    tuple of str or int
        Keys and list positions, from the top of the file.
    """
    path = tuple(part for part in error["loc"] if part != "[key]")
    own: KeyPath = error.get("ctx", {}).get("path", ())
    return (*path, *own)


def reason_and_hint(error: ErrorDetails) -> tuple[str, str | None]:
    """Say what is wrong, and what to do next.

    Parameters
    ----------
    error : ErrorDetails
        One of pydantic's errors on a `SiteFile`.

    Returns
    -------
    reason : str
    hint : str or None
    """
    kind, path, given = error["type"], where(error), error["input"]
    context: dict[str, Any] = error.get("ctx", {})
    if kind == "settings":
        return context["reason"], context["hint"]
    if kind == "extra_forbidden":
        return "unknown key", _nearest_key(path)
    if kind == "missing":
        if path and isinstance(path[-1], int):
            return f"needs at least {path[-1] + 1} entries", None
        return "is required", None
    if kind == "literal_error":
        return _not_among(context["expected"], path, given)
    if kind in _BOUNDS:
        word, bound = _BOUNDS[kind]
        return f"must be {word} {context[bound]:g}, and is {given}", None
    if kind == "string_pattern_mismatch":
        return f'"{given}" may only have small letters a-z, digits and hyphens', None
    if kind == "string_too_short":
        return "must not be empty", None
    if kind in ("too_short", "too_long"):
        side = "least" if kind == "too_short" else "most"
        bound = context["min_length" if kind == "too_short" else "max_length"]
        return f"takes at {side} {bound} entries, and has {len(given)}", None
    if kind == "string_too_long":
        return f"must be one character, and is {given!r}", None
    if kind in _TYPES:
        return f"must be {_TYPES[kind]}, and is {_shown(given)}", _shape_hint(path, given)
    return error["msg"], None


def _nearest_key(path: KeyPath) -> str | None:
    tables = tuple(part for part in path[:-1] if isinstance(part, str))
    if tables[:2] == ("service", "periods"):
        tables = tables[:2]
    word = str(path[-1])
    model = _TABLES.get(tables)
    known = list(model.model_fields) if model is not None else []
    if tables == ("service", "columns") and word in ("columns", "service"):
        return _TOP_LEVEL
    # A right key in a wrong table is likelier than a slip of the pen.
    for other, table in _TABLES.items():
        if table is not model and word in table.model_fields and other:
            return f"It belongs to [{'.'.join(other)}]."
    return nearest(word, known)


def _not_among(expected: str, path: KeyPath, given: object) -> tuple[str, str | None]:
    words = re.findall(r"'([^']*)'", expected)
    if not words:
        return f"must be {expected}, and is {_shown(given)}", None
    choices = ", ".join(words[:-1]) + f" or {words[-1]}" if len(words) > 1 else words[0]
    if path[-1] == given and "periods" in path:
        return f"no such kind of period: {choices}", nearest(str(given), words)
    hint = nearest(given, words) if isinstance(given, str) else None
    return f"must be {choices}, and is {_shown(given)}", hint


def _shown(given: object) -> str:
    if isinstance(given, bool):
        return "true" if given else "false"
    if isinstance(given, str):
        return f'"{given}"'
    if isinstance(given, list | tuple):
        return "a list"
    if isinstance(given, dict):
        return "a table"
    return str(given)


def _shape_hint(path: KeyPath, given: object) -> str | None:
    if path in (("service",), ("sum",)) and isinstance(given, dict):
        return f"Write [[{path[0]}]] with two brackets on each side."
    if path and path[-1] == "columns":
        return "Write [service.columns], or name a map file in quotes."
    return None
