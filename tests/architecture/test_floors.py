"""The floors of the house, and what an import pulls in."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
#: What makes a command slow to start; each is imported only by the command that needs it.
HEAVY = ("numpy", "duckdb", "polars", "pandas", "pyarrow", "plotly", "pydantic", "jinja2")


def test_imports_keep_the_floors() -> None:
    # Given by -c and not as the installed script, so that the venv's PATH does not matter.
    run = subprocess.run(
        [
            sys.executable,
            "-c",
            "from importlinter.cli import lint_imports_command; lint_imports_command()",
            "--no-cache",
            "--no-logo",
        ],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    assert run.returncode == 0, run.stdout + run.stderr
    assert "0 broken" in run.stdout


@pytest.mark.parametrize(
    "code",
    [
        "import meterlens",
        "from meterlens.cli.main import program; program(['--help'], standalone_mode=False)",
        "from meterlens.cli.main import program; program(['--version'], standalone_mode=False)",
    ],
    ids=["import", "help", "version"],
)
def test_the_door_opens_without_heavy_libraries(code: str) -> None:
    watch = f"import sys; {code}; print('loaded:', *[n for n in {HEAVY!r} if n in sys.modules])"
    run = subprocess.run(
        [sys.executable, "-c", watch], cwd=ROOT, capture_output=True, text=True, check=False
    )
    assert run.returncode == 0, run.stderr
    assert run.stdout.splitlines()[-1] == "loaded:"
