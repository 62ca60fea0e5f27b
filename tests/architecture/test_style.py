"""Sizes, names and SQL of the code: what a reviewer would otherwise repeat each time."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
FILES = sorted((ROOT / "meterlens").rglob("*.py"))
LONGEST_FILE, LONGEST_FUNCTION = 300, 60
#: Words that say nothing of what a thing is.
BANNED = {"data", "info", "utils", "helper", "manager", "process", "handle"}

by_file = pytest.mark.parametrize(
    "file", FILES, ids=[f.relative_to(ROOT).as_posix() for f in FILES]
)


def functions(tree: ast.AST) -> Iterator[ast.FunctionDef | ast.AsyncFunctionDef]:
    for node in ast.walk(tree):
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
            yield node


def given_names(tree: ast.AST) -> Iterator[tuple[str, int]]:
    """Names that the code gives: what it merely uses of others is theirs."""
    for node in ast.walk(tree):
        line = getattr(node, "lineno", 0)
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef):
            yield node.name, line
        elif isinstance(node, ast.arg):
            yield node.arg, line
        elif isinstance(node, ast.Name | ast.Attribute) and isinstance(node.ctx, ast.Store):
            yield node.id if isinstance(node, ast.Name) else node.attr, line
        elif isinstance(node, ast.ExceptHandler) and node.name:
            yield node.name, line
        elif isinstance(node, ast.alias):
            yield node.asname or node.name, line


@by_file
def test_files_stay_short(file: Path) -> None:
    lines = len(file.read_text(encoding="utf-8").splitlines())
    assert lines <= LONGEST_FILE, f"{lines} lines: split it by topic"


def code_lines(function: ast.FunctionDef | ast.AsyncFunctionDef) -> int:
    """Lines of a function without its docstring: a cited equation may take its room."""
    first = function.body[0]
    documented = isinstance(first, ast.Expr) and ast.get_docstring(function) is not None
    words = (first.end_lineno or first.lineno) - first.lineno + 1 if documented else 0
    return (function.end_lineno or function.lineno) - function.lineno + 1 - words


@by_file
def test_functions_stay_short(file: Path) -> None:
    tree = ast.parse(file.read_text(encoding="utf-8"))
    lengths = {f.name: code_lines(f) for f in functions(tree)}
    assert not {name: count for name, count in lengths.items() if count > LONGEST_FUNCTION}


@by_file
def test_names_say_what_things_are(file: Path) -> None:
    tree = ast.parse(file.read_text(encoding="utf-8"))
    empty = [f"{name} (line {line})" for name, line in given_names(tree) if name.lower() in BANNED]
    assert not empty
    assert file.stem not in BANNED
    assert file.parent.name not in BANNED


@by_file
def test_modules_say_what_they_are_for(file: Path) -> None:
    tree = ast.parse(file.read_text(encoding="utf-8"))
    if tree.body:
        assert ast.get_docstring(tree), "no module docstring"


def sql_doors(tree: ast.AST) -> Iterator[ast.expr]:
    """The texts handed to DuckDB."""
    for node in ast.walk(tree):
        if (
            isinstance(node, ast.Call)
            and isinstance(node.func, ast.Attribute)
            and node.func.attr in ("execute", "executemany", "sql", "query")
            and node.args
        ):
            yield node.args[0]


@by_file
def test_sql_is_never_built_of_strings(file: Path) -> None:
    tree = ast.parse(file.read_text(encoding="utf-8"))
    texts = list(sql_doors(tree))
    built = [
        f"line {text.lineno}"
        for text in texts
        if isinstance(text, ast.JoinedStr | ast.BinOp)
        or (isinstance(text, ast.Call) and isinstance(text.func, ast.Attribute))
    ]
    assert not built
    if file.parent.name != "store":
        assert not texts, "only the store speaks SQL"
