"""Bad input: one clear message, exit 1, no traceback, and the store as it was."""

from __future__ import annotations

import random
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

import pytest
from small_site import Ran, SmallSite, run

HEADER = "Time,Va,Vb,Vc,Ia,Ib,Ic\n"
STAMPS = ("2026-10-01T00:00", "2026-10-01T00:15", "2026-10-01T00:30", "2026-10-01T00:45")
GOOD = HEADER + "".join(f"{stamp},230,231,232,10,11,12\n" for stamp in STAMPS)
PNG = b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR\x00\x00\x01\x00"


@pytest.fixture
def site(tmp_path: Path) -> SmallSite:
    """A site with four intervals in its store."""
    made = SmallSite(tmp_path / "site").write()
    made.take(GOOD, "good.csv")
    return made


def refused(ran: Ran, *words: str) -> None:
    """One line on stderr with all these words, exit 1, nothing on stdout."""
    assert (ran.code, ran.out) == (1, ""), ran
    assert ran.err.startswith("meterlens: ")
    assert ran.err.count("\n") == 1, ran.err
    assert "Traceback" not in ran.err
    for word in words:
        assert word in ran.err


@dataclass(frozen=True)
class BadExport:
    """An export that cannot be read, and what the message must say."""

    name: str
    content: str | bytes
    words: tuple[str, ...]
    changes: dict[str, object] = field(default_factory=dict)


def _row(stamp: str, values: str = "230,231,232,10,11,12") -> str:
    return f"{stamp},{values}\n"


BAD_EXPORTS = (
    BadExport("column", GOOD.replace("Ib", "Ib [A]"), ("bad.csv:1:", "i_b", '"Ib [A]"')),
    BadExport(
        "time-format",
        GOOD,
        ("bad.csv:2:", "timestamp_format", '"2026-10-01T00:00"', "%d.%m.%Y"),
        {"timestamp_format": "%d.%m.%Y %H:%M"},
    ),
    BadExport("empty", "", ("bad.csv", "empty")),
    BadExport("blanks", " \n\n\t\n  \r\n", ("bad.csv", "empty")),
    BadExport("png", PNG, ("bad.csv", "binary")),
    BadExport("random", random.Random(7).randbytes(5000), ("bad.csv", "binary")),
    BadExport(
        "high-bytes",
        bytes(random.Random(8).choices(range(128, 256), k=5000)),
        ("bad.csv",),
    ),
    BadExport("header-only", HEADER, ("bad.csv", "no rows")),
    BadExport("one-row", HEADER + _row(STAMPS[0]), ("bad.csv", "interval_min")),
    BadExport("one-time", HEADER + 2 * _row(STAMPS[0]), ("bad.csv", "interval_min")),
    BadExport("seconds", HEADER + _row("2026-10-01T00:00:00") + _row("2026-10-01T00:00:10"),
              ("bad.csv", "interval_min", "whole minutes")),
    BadExport(
        "decimal-mark",
        "Time;Va;Vb;Vc;Ia;Ib;Ic\n"
        + "".join(f"{stamp};1,234;1,235;1,236;1,111;1,222;1,333\n" for stamp in STAMPS),
        ("bad.csv", "decimal", '"1,234"'),
    ),
    BadExport("few-fields", HEADER + "a,b\n" + "c,d\n", ("bad.csv", "7 fields")),
    BadExport("header-row", GOOD, ("bad.csv", "header_row", "50"), {"header_row": 50}),
    BadExport("twice", GOOD.replace("Ib", "Ia"), ("bad.csv:1:", "i_a", '"Ia"', "2 times")),
    BadExport("utf-16", GOOD, ("bad.csv", "encoding", "utf-16"), {"encoding": "utf-16"}),
    BadExport("long-line", "x" * 200_000, ("bad.csv",)),
    BadExport(
        "milliseconds",
        HEADER + "".join(_row(f"{1796075940000 + 60000 * n}") for n in range(4)),
        ("bad.csv",),
        {"timestamp_format": "epoch"},
    ),
    BadExport("months", HEADER + _row("2026-10-01T00:00") + _row("2026-11-01T00:00"),
              ("bad.csv", "interval_min")),
)  # fmt: skip


@pytest.mark.parametrize("case", BAD_EXPORTS, ids=lambda case: str(case.name))
def test_export_that_cannot_be_read(site: SmallSite, case: BadExport) -> None:
    """Nothing of it is stored, with or without ``--json``."""
    before = site.contents()
    bad = site.export(case.content, "bad.csv")
    site.write(**case.changes)
    refused(site.run("ingest", "--json", bad), *case.words)
    refused(site.run("ingest", bad), *case.words)
    site.write()
    assert site.contents() == before


def test_folder_instead_of_a_file(site: SmallSite) -> None:
    """A folder is told from a file."""
    before = site.contents()
    (site.folder / "exports").mkdir()
    refused(site.run("ingest", site.folder / "exports"), "exports", "folder")
    assert site.contents() == before


def test_missing_file(site: SmallSite) -> None:
    """One that is not there stops the command before any other is read."""
    before = site.contents()
    other = site.export(GOOD.replace("2026-10", "2026-11"), "other.csv")
    refused(site.run("ingest", other, site.folder / "nowhere.csv"), "nowhere.csv", "no such file")
    assert site.contents() == before


def test_no_export_matches(site: SmallSite) -> None:
    """A bare ingest that finds nothing says where to look."""
    before = site.contents()
    (site.folder / "good.csv").unlink()
    refused(site.run("ingest"), "site.toml", "files")
    assert site.contents() == before


@pytest.mark.parametrize("command", ["ingest", "check", "review", "periods"])
def test_unknown_service(site: SmallSite, command: str) -> None:
    """The ids that there are stand in the message."""
    before = site.contents()
    refused(site.run(command, "--service", "mian"), '"mian"', "main")
    assert site.contents() == before


@pytest.mark.parametrize("command", ["review", "periods"])
def test_unknown_month(site: SmallSite, command: str) -> None:
    """A month outside the record is a request that does not fit; a mistyped one wrong usage."""
    refused(site.run(command, "--month", "2031-01"), "2031-01")
    mistyped = site.run(command, "--month", "2026-13")
    assert (mistyped.code, mistyped.out) == (2, "")
    assert "2026-13" in mistyped.err


BAD_SITES = {
    "misspelt-key": ('v_a = "Va"', 'v_aa = "Va"', ("v_aa", "v_a")),
    "misspelt-service-key": ("rating_a = 100", "rateing_a = 100", ("rateing_a", "rating_a")),
    "broken": ("[site]", "[site", ()),
    "required": ('clock = "utc"\n', "", ("clock",)),
    "required-name": ('name = "Small Site"\n', "", ("name",)),
    "impossible": ("rating_a = 100", "rating_a = -5", ("rating_a",)),
    "zone": ('"Europe/Lisbon"', '"Europe/Lisboa"', ("timezone", "Europe/Lisbon")),
    "word": ('clock = "utc"', 'clock = "UCT"', ("clock", "utc")),
}


@pytest.mark.parametrize("name", list(BAD_SITES))
@pytest.mark.parametrize("command", ["ingest", "review"])
def test_site_that_cannot_be_used(site: SmallSite, name: str, command: str) -> None:
    """The file, the line and the key, and the nearest valid spelling."""
    before = site.contents()
    old, new, words = BAD_SITES[name]
    file = site.folder / "site.toml"
    text = file.read_text(encoding="utf-8")
    assert old in text
    file.write_text(text.replace(old, new, 1), encoding="utf-8")
    refused(site.run(command, "--json"), "site.toml:", *words)
    site.write()
    assert site.contents() == before


def test_no_site_at_all(tmp_path: Path) -> None:
    """No site.toml upward of the current folder, or in the folder that is named."""
    refused(run("review", cwd=tmp_path), "site.toml")
    refused(run("review", "--site", tmp_path), "site.toml")


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
def holder(site: SmallSite) -> Iterator[int]:
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


@pytest.mark.parametrize("command", ["ingest", "review", "check", "query"])
def test_locked_store(site: SmallSite, holder: int, command: str) -> None:
    """The message names the process that holds it."""
    more = ["select count(*) from interval"] if command == "query" else []
    refused(site.run(command, "--json", *more), "store.duckdb", f"PID {holder}")


def test_lock_leaves_the_store_as_it_was(site: SmallSite, request: pytest.FixtureRequest) -> None:
    """What another process kept out is not half done."""
    before = site.contents()
    other = site.export(GOOD.replace("2026-10", "2026-11"), "other.csv")
    request.getfixturevalue("holder")
    refused(site.run("ingest", other), "PID")
    assert "other.csv" not in str(before)


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


@pytest.mark.parametrize("sql", [*WRITING, "selec v_a from interval", "select nothing from interval"])
def test_query_that_writes_or_fails(site: SmallSite, tmp_path: Path, sql: str) -> None:
    """It changes nothing and writes no file."""
    before = site.contents()
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


def test_as_a_process_of_its_own(site: SmallSite) -> None:
    """No traceback, exit code and streams as a shell sees them."""
    for content, code in ((PNG, 1), (GOOD.encode(), 0)):
        bad = site.export(content, "bad.csv")
        ran = subprocess.run(
            [sys.executable, "-m", "meterlens", "ingest", "--json", str(bad)],
            cwd=site.folder,
            capture_output=True,
            text=True,
            encoding="utf-8",
            check=False,
        )
        assert ran.returncode == code
        assert (ran.stdout == "") == bool(code)
        assert ran.stderr.count("\n") == (1 if code else 0), ran.stderr
