"""A small site written by hand, and the command line run inside this process.

`run` goes through the program's own front door, so that what it prints, where it prints it
and its exit code are those that a person gets.
"""

from __future__ import annotations

import io
import json
import os
import shutil
import sys
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager, redirect_stderr, redirect_stdout
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any
from unittest.mock import patch

from meterlens.cli.main import main

COUNTS = ("rows_stored", "rows_replaced", "rows_duplicate", "rows_rejected")
STAMPS = tuple(f"2026-10-01T00:{minute:02d}" for minute in (0, 15, 30, 45))
VALUES = {"v_a": "Va", "v_b": "Vb", "v_c": "Vc", "i_a": "Ia", "i_b": "Ib", "i_c": "Ic"}

HEADER = "Time,Va,Vb,Vc,Ia,Ib,Ic\n"
#: Four good rows of the usual map.
GOOD = HEADER + "".join(f"{stamp},230,231,232,10,11,12\n" for stamp in STAMPS)
PNG = b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR\x00\x00\x01\x00"


@dataclass(frozen=True)
class Ran:
    """What one command left behind: its exit code and what it printed."""

    code: int
    out: str
    err: str

    @property
    def document(self) -> Any:
        """Standard output as strict JSON: nothing before or after it, no NaN."""
        return json.loads(self.out, parse_constant=_refuse)


def _refuse(constant: str) -> float:
    raise AssertionError(f"{constant} is not JSON")


@contextmanager
def _folder(cwd: Path | None) -> Iterator[None]:
    before = Path.cwd()
    os.chdir(cwd or before)
    try:
        yield
    finally:
        os.chdir(before)


def run(*arguments: str | Path, cwd: Path | None = None) -> Ran:
    """Run one command; an exception that reaches the user as a traceback is raised here."""
    out, err, code = io.StringIO(), io.StringIO(), 0
    argv = ["meterlens", *map(str, arguments)]
    with _folder(cwd), patch.object(sys, "argv", argv), redirect_stdout(out), redirect_stderr(err):
        try:
            main()
        except SystemExit as end:
            code = end.code if isinstance(end.code, int) else int(end.code is not None)
    return Ran(code, out.getvalue(), err.getvalue())


def toml_value(value: object) -> str:
    """One value as TOML; JSON spells these types the same."""
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{k} = {toml_value(v)}" for k, v in value.items()) + " }"
    return json.dumps(value, ensure_ascii=False)


@dataclass
class SmallSite:
    """One service, "main", 400 V and 100 A, in a folder of its own."""

    folder: Path
    timezone: str = "Europe/Lisbon"
    _answers: dict[str, tuple[Any, ...]] = field(default_factory=dict, repr=False)

    def write(self, columns: Mapping[str, object] | None = None, /, **changes: object) -> SmallSite:
        """Write site.toml: the usual map, with `changes` (None takes a key out)."""
        lines = [
            "[site]",
            'name = "Small Site"',
            f'timezone = "{self.timezone}"',
            "",
            "[[service]]",
            'id = "main"',
            'name = "Main"',
            'connection = "wye-4w"',
            "nominal_voltage_v = 400",
            "rating_a = 100",
            'files = ["*.csv"]',
            "",
            "[service.columns]",
        ]
        usual: dict[str, object] = {"timestamp": "Time", "clock": "utc", "stamp": "start"}
        usual |= VALUES if columns is None else columns
        for key, value in (usual | changes).items():
            if value is not None:
                lines.append(f"{key} = {toml_value(value)}")
        self.folder.mkdir(parents=True, exist_ok=True)
        (self.folder / "site.toml").write_text("\n".join(lines) + "\n", encoding="utf-8")
        return self

    def export(self, text: str | bytes, name: str = "export.csv", encoding: str = "utf-8") -> Path:
        """Write an export beside site.toml, its line ends as they are."""
        path = self.folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(text if isinstance(text, bytes) else text.encode(encoding))
        return path

    def run(self, command: str, *arguments: str | Path) -> Ran:
        """Run one command on this site."""
        self._answers.clear()
        return run(command, "--site", self.folder, *arguments)

    def ingest(self, *arguments: str | Path) -> list[dict[str, Any]]:
        """Ingest files with ``--json``; the four row counts must add up to the rows read."""
        ran = self.run("ingest", "--json", *arguments)
        assert ran.code == 0, ran.err
        files: list[dict[str, Any]] = ran.document["files"]
        for one in files:
            assert sum(one[key] for key in COUNTS) == one["rows_read"], one
        return files

    def take(self, text: str | bytes, name: str = "export.csv", encoding: str = "utf-8") -> Any:
        """Write one export, ingest it and return its outcome."""
        return self.ingest(self.export(text, name, encoding))[0]

    def query(self, sql: str) -> list[list[Any]]:
        """Rows that ``meterlens query`` gives."""
        ran = self.run("query", "--json", sql)
        assert ran.code == 0, ran.err
        rows: list[list[Any]] = ran.document["rows"]
        return rows

    def starts(self) -> list[str]:
        """Stored starts in UTC, ISO to the minute, in order."""
        return [row[0][:16] for row in self.stored("start_utc")]

    def stored(self, *columns: str) -> list[list[Any]]:
        """The chosen columns of every stored interval, in order of start.

        The view is asked for once after each command.
        """
        if not self._answers:
            document = self.run("query", "--json", "interval").document
            self._answers = dict(
                zip(document["columns"], zip(*document["rows"], strict=True), strict=True)
            )
        chosen = [self._answers[column] for column in columns]
        return [list(row) for row in zip(*chosen, strict=True)]

    def contents(self) -> list[list[Any]]:
        """Counts and sums over everything that the store shows."""
        if not (self.folder / "store.duckdb").exists():
            return []
        return self.query(
            "select (select count(*) from interval), (select count(*) from reject), "
            "(select count(*) from history), (select count(*) from file), "
            "(select fsum(v_a) from interval), (select fsum(i_a) from interval), "
            "(select fsum(p_kw) from interval_power), (select fsum(epoch(start_utc)) from interval)"
        )


def kept_copy(kept: SmallSite, folder: Path) -> SmallSite:
    """The same site, store and all, in a folder of its own."""
    shutil.copytree(kept.folder, folder)
    return SmallSite(folder, kept.timezone)


def counts(outcome: dict[str, Any]) -> tuple[int, ...]:
    """Read, stored, replaced, duplicate and rejected rows of one file."""
    return (outcome["rows_read"], *(outcome[key] for key in COUNTS))


def table(rows: Sequence[Sequence[object]], delimiter: str = ",", end: str = "\n") -> str:
    """Rows as text, every line ended."""
    return "".join(delimiter.join(map(str, row)) + end for row in rows)


def refused(ran: Ran, *words: str) -> None:
    """One line on stderr with all these words, exit 1, nothing on stdout."""
    assert (ran.code, ran.out) == (1, ""), ran
    assert ran.err.startswith("meterlens: ")
    assert ran.err.count("\n") == 1, ran.err
    for word in words:
        assert word in ran.err, ran.err
