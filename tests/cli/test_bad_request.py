"""Requests that cannot be answered: the store, the questions to it, and wrong usage."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from small_site import GOOD, PNG, SmallSite, kept_copy, refused, run


@pytest.fixture(scope="module")
def kept(tmp_path_factory: pytest.TempPathFactory) -> SmallSite:
    """A site with four intervals in its store, never touched again."""
    made = SmallSite(tmp_path_factory.mktemp("kept") / "site").write()
    made.take(GOOD, "good.csv")
    return made


@pytest.fixture(scope="module")
def before(kept: SmallSite) -> list[list[Any]]:
    """What that store shows."""
    return kept.contents()


@pytest.fixture
def site(kept: SmallSite, tmp_path: Path) -> SmallSite:
    """A copy of it."""
    return kept_copy(kept, tmp_path / "site")


def test_no_store_yet(tmp_path: Path) -> None:
    """A question before the first ingest says what to do and makes no file."""
    site = SmallSite(tmp_path).write()
    refused(site.run("review"), "store.duckdb", "meterlens ingest")
    assert not (tmp_path / "store.duckdb").exists()


@pytest.mark.parametrize("content", [b"not a store at all\n" * 300, PNG * 900, b""])
def test_store_that_is_none(site: SmallSite, content: bytes) -> None:
    """A file in the store's place is left alone."""
    store = site.folder / "store.duckdb"
    store.write_bytes(content)
    refused(site.run("review"), "store.duckdb")
    assert store.read_bytes() == content


@pytest.fixture
def holder(site: SmallSite, before: list[list[Any]]) -> Iterator[int]:
    """PID of another process that holds the store open for writing."""
    hold = "import duckdb, sys; c = duckdb.connect(sys.argv[1]); print(1, flush=True); input()"
    store = str(site.folder / "store.duckdb")
    with subprocess.Popen(
        [sys.executable, "-c", hold, store], stdin=subprocess.PIPE, stdout=subprocess.PIPE
    ) as other:
        assert other.stdout is not None
        other.stdout.readline()
        yield other.pid
        other.communicate(b"\n")
    assert site.contents() == before


@pytest.mark.parametrize("command", ["ingest", "review", "check", "query"])
def test_locked_store(site: SmallSite, holder: int, command: str) -> None:
    """The message names the process that holds it."""
    more = ["select count(*) from interval"] if command == "query" else []
    refused(site.run(command, "--json", *more), "store.duckdb", f"PID {holder}")


WRITING = (
    "delete from reading where true",
    "update reading set v_a = 0 where true",
    "drop view interval",
    "create table mine as select 1",
    "select 1; delete from reading",
    "copy interval to 'written.csv'",
    "attach 'written.duckdb' as other",
    "export database 'written'",
)


@pytest.mark.parametrize(
    "sql", [*WRITING, "selec v_a from interval", "select nothing from interval"]
)
def test_query_that_writes_or_fails(
    site: SmallSite, before: list[list[Any]], tmp_path: Path, sql: str
) -> None:
    """It changes nothing and writes no file."""
    refused(run("query", "--site", site.folder, sql, cwd=tmp_path), "query")
    assert site.contents() == before
    assert not list(tmp_path.glob("written*"))


@pytest.mark.parametrize("sql", ["select 'nan'::double as x", "select v_a / 0 as x from interval"])
def test_query_without_a_finite_answer(site: SmallSite, sql: str) -> None:
    """What is no number is null in JSON, never NaN and never a traceback."""
    rows = site.query(sql)
    assert {row[0] for row in rows} == {None}


@pytest.mark.parametrize("question", ["intervall", "check/gaps"])
def test_query_of_an_unknown_name(site: SmallSite, question: str) -> None:
    """The nearest names are offered."""
    near = {"intervall": "interval", "check/gaps": "check/gap"}[question]
    refused(site.run("query", question), f'"{question}"', near)


def test_export_that_cannot_be_written(site: SmallSite, tmp_path: Path) -> None:
    """An unknown ending, an unknown view, a place that is no folder, a folder of that name."""
    refused(site.run("export", "interval", "--out", tmp_path / "x.docx"), "x.docx", ".csv")
    refused(site.run("export", "intervals", "--out", tmp_path / "x.csv"), "interval")
    inside_a_file = site.folder / "good.csv" / "x.csv"
    refused(site.run("export", "interval", "--out", inside_a_file), "cannot be written")
    (tmp_path / "folder.csv").mkdir()
    refused(site.run("export", "interval", "--out", tmp_path / "folder.csv"), "cannot be written")
    assert not list(tmp_path.glob("**/*.part"))


WRONG_USAGE = (
    (["periods", "--kind", "low-pff"], "low-pf"),
    (["periods", "--kindd", "low-pf"], "--kind"),
    (["export", "interval"], "--out"),
    (["query"], "NAME_OR_SQL"),
    (["review", "--month", "October"], "October"),
    (["query", "file", "--set", "nothing"], "NAME=VALUE"),
)


@pytest.mark.parametrize(("arguments", "word"), WRONG_USAGE)
def test_wrong_usage(site: SmallSite, arguments: list[str], word: str) -> None:
    """Exit 2, the usage on stderr."""
    ran = site.run(arguments[0], *arguments[1:])
    assert (ran.code, ran.out) == (2, "")
    assert word in ran.err


def test_unknown_command() -> None:
    """Exit 2, with the nearest command."""
    ran = run("reveiw")
    assert (ran.code, ran.out) == (2, "")
    assert "review" in ran.err


def test_file_of_no_known_service(site: SmallSite) -> None:
    """With several services and no pattern that names the file: wrong usage, with the ids."""
    file = site.folder / "site.toml"
    text = file.read_text(encoding="utf-8")
    second = text[text.index("[[service]]") :].replace('"main"', '"annex"')
    file.write_text(text + "\n" + second.replace("*.csv", "annex/*.csv"), encoding="utf-8")
    other = site.export(GOOD, "elsewhere/other.txt")
    ran = site.run("ingest", other)
    assert (ran.code, ran.out) == (2, "")
    assert "main, annex" in ran.err
