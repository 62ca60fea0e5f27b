"""The statements of `queries/`: one a file, and each says what it is."""

from __future__ import annotations

import re
from pathlib import Path

import duckdb
import pytest

from meterlens.store.query_files import load_query, query_folder, query_names

NAMES = query_names()
#: Folders whose rows a command prints or a page draws: same input, same bytes.
PRINTED = ("month/", "period/", "check/", "interval/")
#: Roots, powers, trigonometry and logarithms have their home in the kernel.
KERNEL_ONLY = re.compile(
    r"\b(sqrt|cbrt|pow|power|exp|ln|log|log2|log10|sin|cos|tan|cot|asin|acos|atan|atan2|sinh"
    r"|cosh|tanh|asinh|acosh|atanh|radians|degrees|pi|hypot)\s*\(|\^|\*\*"
)
#: All that a plain `sum` may add: whole minutes and marks. Doubles take `fsum`, whose last
#: digits do not depend on which thread was first.
WHOLE_NUMBERS = {
    "interval_min",
    "minutes",
    "p_min",
    "q_min",
    "opens::integer",
    "intervals",
    "(not before_without or before_end_utc <> start_utc)::integer",
    "case when p_kw is not null then interval_min else 0 end",
    "case when q_kvar is not null then interval_min else 0 end",
}
by_name = pytest.mark.parametrize("name", NAMES)


def written(name: str) -> str:
    return (query_folder() / f"{name}.sql").read_text(encoding="utf-8")


def bare(name: str) -> str:
    """The statement without comments, and with its texts emptied."""
    return re.sub(r"'[^']*'", "''", re.sub(r"--[^\n]*", "", written(name)))


def called(text: str, function: str) -> list[str]:
    """Arguments of every call of a function, white space evened out."""
    found = []
    for match in re.finditer(rf"\b{function}\(", text):
        depth, end = 1, match.end()
        while depth:
            depth += {"(": 1, ")": -1}.get(text[end], 0)
            end += 1
        found.append(" ".join(text[match.end() : end - 1].split()))
    return found


def test_there_are_queries_in_every_room() -> None:
    rooms = {name.split("/")[0] for name in NAMES}
    assert rooms >= {"schema", "ingest", "check", "interval", "month", "period"}
    assert all(Path(name).parts[1:] for name in NAMES)


@by_name
def test_name_is_lower_case_words(name: str) -> None:
    assert re.fullmatch(r"[a-z]+/[a-z][a-z0-9_]*", name)


@by_name
def test_header_says_what_it_is(name: str) -> None:
    lines = written(name).splitlines()
    header = lines[: next(i for i, x in enumerate(lines) if x[:2] != "--")]
    kinds = [re.match(r"-- (args|row): \S", line) for line in header]
    marks = [kind[1] for kind in kinds if kind]
    assert marks == ["args", "row"], "after the sentence come args and row, in this order"
    assert kinds[-1]
    assert kinds[-2]
    about = " ".join(line[3:] for line in header[:-2])
    assert re.match(r"[A-Z].*\.$", about), "what it is, in a sentence"
    assert load_query(name).about == about
    assert written(name).endswith(";\n")


@by_name
def test_args_are_what_duckdb_says(name: str) -> None:
    line = next(x for x in written(name).splitlines() if x.startswith("-- args:"))
    said = line.removeprefix("-- args:").strip()
    args = [] if said == "none" else [arg.strip() for arg in said.split(",")]
    with duckdb.connect() as con:
        statements = con.extract_statements(written(name))
    assert len(statements) == 1, "one statement a file"
    assert sorted(args) == sorted(f"${p}" for p in statements[0].named_parameters)
    assert list(load_query(name).parameters) == [arg.lstrip("$") for arg in args]


@by_name
def test_keywords_are_lower_case_and_lines_indented_by_four(name: str) -> None:
    assert bare(name) == bare(name).lower()
    for line in written(name).splitlines():
        assert "\t" not in line
        assert line == line.rstrip()
        assert (len(line) - len(line.lstrip(" "))) % 4 == 0, line


@by_name
def test_formulas_of_the_kernel_are_not_in_sql(name: str) -> None:
    found = KERNEL_ONLY.search(bare(name))
    assert not found, f"{found and found[0]} belongs in the electrical kernel"


@by_name
def test_sums_do_not_depend_on_threads(name: str) -> None:
    text = bare(name)
    assert set(called(text, "sum")) <= WHOLE_NUMBERS
    assert not called(text, "avg")
    assert not called(text, "mean")


@pytest.mark.parametrize("name", [n for n in NAMES if n.startswith(PRINTED)])
def test_printed_rows_have_a_total_order(name: str) -> None:
    if load_query(name).row.startswith("the one "):
        return
    last = bare(name).rstrip().rstrip(";").splitlines()
    ends = [line for line in last if line.startswith("order by ")]
    assert ends == last[-1:], "the statement ends with order by"


def test_the_check_of_a_statement_sees_what_it_forbids() -> None:
    for text in ("select sqrt(x)", "x ** 2", "x^2", "atan2 (y, x)", "pow(x, 2)"):
        assert KERNEL_ONLY.search(text)
    assert called("fsum(a) + sum(b * (c + 1))", "sum") == ["b * (c + 1)"]
    assert not KERNEL_ONLY.search("select * from power where catalog = length(x)")
