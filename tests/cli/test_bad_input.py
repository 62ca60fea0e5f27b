"""Exports and settings that cannot be used: one clear message, and the store as it was."""

from __future__ import annotations

import os
import random
import subprocess
import sys
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import pytest
from small_site import GOOD, HEADER, PNG, STAMPS, SmallSite, kept_copy, refused, run


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
        ("bad.csv:2:", "timestamp_format", "milliseconds"),
        {"timestamp_format": "epoch"},
    ),
    BadExport("column-free-name", GOOD.replace("Ib", "I2"), ("i_b", 'file: "I2". Correct')),
    BadExport("endless-line", "x" * 5_000_000, ("bad.csv:1:", "first line", "4 MiB")),
    BadExport(
        "offset-under-local",
        HEADER + "".join(_row(stamp + "Z") for stamp in STAMPS),
        ("bad.csv:2:", "timestamp_format", 'clock = "offset"'),
        {"clock": "local"},
    ),
    BadExport("months", HEADER + _row("2026-10-01T00:00") + _row("2026-11-01T00:00"),
              ("bad.csv", "interval_min")),
)  # fmt: skip


@pytest.mark.parametrize("case", BAD_EXPORTS, ids=lambda case: str(case.name))
def test_export_that_cannot_be_read(
    site: SmallSite, before: list[list[Any]], case: BadExport
) -> None:
    """Nothing of it is stored, nothing stands on stdout."""
    bad = site.export(case.content, "bad.csv")
    site.write(**case.changes)
    refused(site.run("ingest", "--json", bad), *case.words)
    site.write()
    assert site.contents() == before


def test_folder_instead_of_a_file(site: SmallSite, before: list[list[Any]]) -> None:
    """A folder is told from a file."""
    (site.folder / "exports").mkdir()
    refused(site.run("ingest", site.folder / "exports"), "exports", "folder")
    assert site.contents() == before


def test_pipe_instead_of_a_file(site: SmallSite, before: list[list[Any]]) -> None:
    """Nobody writes into it: the command must not wait."""
    os.mkfifo(site.folder / "pipe.csv")
    refused(site.run("ingest", site.folder / "pipe.csv"), "pipe.csv", "regular file")
    (site.folder / "pipe.csv").unlink()
    assert site.contents() == before


def test_missing_file(site: SmallSite, before: list[list[Any]]) -> None:
    """One that is not there stops the command before any other is read."""
    other = site.export(GOOD.replace("2026-10", "2026-11"), "other.csv")
    refused(site.run("ingest", other, site.folder / "nowhere.csv"), "nowhere.csv", "no such file")
    assert site.contents() == before


def test_no_export_matches(site: SmallSite, before: list[list[Any]]) -> None:
    """A bare ingest that finds nothing says where to look."""
    (site.folder / "good.csv").unlink()
    refused(site.run("ingest"), "site.toml", "files")
    assert site.contents() == before


@pytest.mark.parametrize("command", ["ingest", "check", "review", "periods"])
def test_unknown_service(site: SmallSite, before: list[list[Any]], command: str) -> None:
    """The ids that there are stand in the message."""
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
def test_site_that_cannot_be_used(
    site: SmallSite, before: list[list[Any]], name: str, command: str
) -> None:
    """The file, the line and the key, and the nearest valid spelling."""
    old, new, words = BAD_SITES[name]
    file = site.folder / "site.toml"
    text = file.read_text(encoding="utf-8")
    assert old in text
    file.write_text(text.replace(old, new, 1), encoding="utf-8")
    refused(site.run(command, "--json"), "site.toml:", *words)
    site.write()
    assert site.contents() == before


@pytest.mark.parametrize("pattern", ["/srv/exports/*.csv", "**x/*.csv"])
def test_files_pattern_that_cannot_be_used(site: SmallSite, pattern: str) -> None:
    """An absolute pattern, and stars where none can stand."""
    file = site.folder / "site.toml"
    text = file.read_text(encoding="utf-8")
    file.write_text(text.replace('"*.csv"', f'"{pattern}"'), encoding="utf-8")
    refused(site.run("ingest"), "site.toml", "files")


def test_no_site_at_all(tmp_path: Path) -> None:
    """No site.toml upward of the current folder, or in the folder that is named."""
    refused(run("review", cwd=tmp_path), "site.toml")
    refused(run("review", "--site", tmp_path), "site.toml")


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


def test_terminal_that_knows_ascii_only(site: SmallSite) -> None:
    """Names, dashes and table lines that it cannot show end no command."""
    path = site.export(GOOD.replace("2026-10", "2026-11"), "\u00e9.csv")
    for arguments in (["ingest", str(path)], ["ingest", "--json", str(path)], ["check"]):
        ran = subprocess.run(
            [sys.executable, "-m", "meterlens", *arguments],
            cwd=site.folder,
            env=os.environ | {"PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"},
            capture_output=True,
            check=False,
        )
        assert ran.returncode == 0, ran.stderr
