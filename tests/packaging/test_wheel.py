"""The wheel holds all that the program needs, and runs from it alone."""

from __future__ import annotations

import os
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

from meterlens import __version__

pytest.importorskip("hatchling", reason="hatchling builds the wheel; it is in the test extra")

ROOT = Path(__file__).resolve().parents[2]


def quietly(*command: str, cwd: Path, **more: str) -> str:
    # The checkout must not stand in for what the wheel lacks.
    clean = {key: value for key, value in os.environ.items() if key != "PYTHONPATH"}
    run = subprocess.run(
        [sys.executable, *command],
        cwd=cwd,
        env=clean | more,
        capture_output=True,
        text=True,
        check=False,
    )
    assert run.returncode == 0, run.stdout + run.stderr
    return run.stdout


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("wheel")
    quietly(
        *("-m", "pip", "--disable-pip-version-check", "wheel", str(ROOT), "--no-deps"),
        *("--no-build-isolation", "--wheel-dir", str(out)),
        cwd=out,
    )
    (built,) = out.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    target = tmp_path_factory.mktemp("installed")
    quietly(
        *("-m", "pip", "--disable-pip-version-check", "install", "--no-deps", "--no-index"),
        *("--no-compile", "--target", str(target), str(wheel)),
        cwd=target,
    )
    return target


def shipped(folder: str, pattern: str) -> set[str]:
    """Files of the checkout, by the names that they have in the wheel."""
    inside = "" if folder == "meterlens" else "meterlens/"
    return {
        inside + path.relative_to(ROOT).as_posix()
        for path in (ROOT / folder).rglob(pattern)
        if path.is_file() and "__pycache__" not in path.parts
    }


def test_wheel_holds_everything(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        names = set(archive.namelist())
    wanted = (
        shipped("meterlens", "*.py")
        | shipped("meterlens", "*.j2")
        | shipped("queries", "*.sql")
        | shipped("demo_data", "exports/*")
        | {
            "meterlens/py.typed",
            "meterlens/settings/new_site.toml",
            "meterlens/report/templates/page.css",
            "meterlens/report/templates/page.js",
            "meterlens/demo_data/site.toml",
            "meterlens/demo_data/README.md",
        }
    )
    assert wanted <= names, sorted(wanted - names)
    assert len([name for name in wanted if name.endswith(".sql")]) > 50
    assert any(name.endswith("licenses/LICENSE") for name in names)


def test_wheel_holds_nothing_else(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        names = archive.namelist()
    top = {name.split("/")[0] for name in names}
    assert top == {"meterlens", f"meterlens-{__version__}.dist-info"}
    assert not [n for n in names if n.endswith((".pyc", ".duckdb", ".wal")) or "__pycache__" in n]
    assert wheel.stat().st_size < 3_000_000


def test_it_runs_from_the_wheel(installed: Path, tmp_path: Path) -> None:
    where = {"PYTHONPATH": str(installed)}
    said = quietly("-m", "meterlens", "--version", cwd=tmp_path, **where)
    assert said.split()[-1] == __version__
    listing = quietly(
        "-c",
        "import meterlens; print(meterlens.__file__)\n"
        "from meterlens.store.query_files import load_query, query_folder, query_names\n"
        "print(query_folder())\n"
        "print(*[load_query(name).name for name in query_names()], sep='\\n')",
        cwd=tmp_path,
        **where,
    ).splitlines()
    assert Path(listing[0]).is_relative_to(installed)
    assert Path(listing[1]) == installed / "meterlens" / "queries"
    assert f"meterlens/queries/{listing[2]}.sql" in shipped("queries", "*.sql")
    assert len(listing) - 2 == len(shipped("queries", "*.sql"))


def test_a_site_can_be_made_and_asked_from_the_wheel(installed: Path, tmp_path: Path) -> None:
    where = {"PYTHONPATH": str(installed)}
    quietly("-m", "meterlens", "init", "site", cwd=tmp_path, **where)
    site = tmp_path / "site"
    header = "Time,V1,V2,V3,I1,I2,I3,PF1,PF2,PF3"
    rows = [f"2026-03-02 08:{m:02d},230,230,230,100,100,100,.8,.8,.8" for m in (0, 15, 30, 45)]
    export = "\n".join([header, *rows]) + "\n"
    (site / "exports" / "main-1.csv").write_text(export, encoding="utf-8")
    quietly("-m", "meterlens", "ingest", cwd=site, **where)
    said = quietly("-m", "meterlens", "query", "month/names", "--json", cwd=site, **where)
    assert '"2026-03"' in said
