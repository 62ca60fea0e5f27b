"""The demo site: its generator writes the committed bytes, and the files say what it claims."""

from __future__ import annotations

import json
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

DEMO = Path(__file__).resolve().parents[2] / "demo_data"
RULES = ("low-pf", "leading", "current-imbalance", "voltage-imbalance", "voltage", "overload")
HEAD_LINES = {"plant": 7}
"""Lines up to the header and its units row, where there is more than a header."""


@pytest.fixture(scope="module")
def regenerated(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder into which the generator has just written."""
    folder = tmp_path_factory.mktemp("demo")
    subprocess.run(
        [sys.executable, "-B", str(DEMO / "generate.py"), "--out", str(folder)],
        check=True,
        timeout=60,
    )
    return folder


def _files(folder: Path) -> list[str]:
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


def test_generator_writes_the_committed_bytes(regenerated: Path) -> None:
    written = _files(regenerated)
    assert [name for name in written if name.startswith("exports")] == [
        f"exports/{path.name}" for path in sorted((DEMO / "exports").iterdir())
    ]
    assert {"planted.json", "README.md"} < set(written)
    for name in written:
        assert (regenerated / name).read_bytes() == (DEMO / name).read_bytes(), name


def test_demo_stays_small() -> None:
    assert sum(path.stat().st_size for path in DEMO.rglob("*") if path.is_file()) < 8_000_000


def test_generator_shares_no_code_with_the_program() -> None:
    sources = [DEMO / "generate.py", *(DEMO / "generator").glob("*.py")]
    imports = [
        line
        for source in sources
        for line in source.read_text(encoding="utf-8").splitlines()
        if line.startswith(("import ", "from "))
    ]
    assert imports
    assert not [line for line in imports if "meterlens" in line]


def test_every_rule_finds_what_was_planted_and_nothing_else() -> None:
    document = json.loads((DEMO / "planted.json").read_text(encoding="utf-8"))
    planted = [entry for entry in document["planted"] if entry["kind"] in RULES]
    assert {entry["kind"] for entry in planted} == set(RULES)
    for entry in planted:
        (period,) = entry["periods"]
        assert (period["start"], period["end"]) == (entry["start"], entry["end"]), entry["key"]
    assert sum(document["period_counts"].values()) == len(planted)


def test_expected_row_outcomes_add_up_with_the_files() -> None:
    document = json.loads((DEMO / "planted.json").read_text(encoding="utf-8"))
    names = [entry["file"] for entry in document["files"]]
    assert names == [f"exports/{path.name}" for path in sorted((DEMO / "exports").iterdir())]
    for entry in document["files"]:
        lines = (DEMO / entry["file"]).read_bytes().splitlines()
        assert entry["rows_read"] == len(lines) - HEAD_LINES.get(entry["service"], 1)
        outcomes = ("stored", "replaced", "duplicate", "rejected")
        assert entry["rows_read"] == sum(entry[f"rows_{outcome}"] for outcome in outcomes)
        row_rejects = [reject for reject in entry["rejects"] if reject["column"] is None]
        assert len(row_rejects) == entry["rows_rejected"]
        assert len(entry["rejects"]) - len(row_rejects) == entry["values_rejected"]


def test_site_names_columns_that_the_exports_have() -> None:
    site = tomllib.loads((DEMO / "site.toml").read_text(encoding="utf-8"))
    for service in site["service"]:
        columns = service["columns"]
        (pattern,) = service["files"]
        paths = sorted(DEMO.glob(pattern))
        assert paths, pattern
        stamps = columns["timestamp"]
        named = {columns[key] for key in columns if key[:2] in ("v_", "i_", "p_", "q_")}
        named |= {columns[f"pf_{phase}"] for phase in "abc" if f"pf_{phase}" in columns}
        named |= set([stamps] if isinstance(stamps, str) else stamps)
        for path in paths:
            lines = path.read_text(encoding=columns.get("encoding", "utf-8")).splitlines()
            header = lines[columns.get("header_row", 1) - 1]
            assert named == set(header.split(columns.get("delimiter", ","))), path.name
