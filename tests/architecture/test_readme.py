"""What the README says is what happens."""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import click
import pytest
from column_dictionary import PAGE, with_dictionary
from readme_blocks import README, blocks, commands

from meterlens.cli.main import COMMANDS, program

ROOT = README.parent


def test_it_begins_with_the_job_then_the_demo_then_the_tests() -> None:
    paragraphs = README.read_text(encoding="utf-8").split("\n\n")
    assert paragraphs[0] == "# meterlens"
    assert len(paragraphs[1]) > 300
    assert "`" not in paragraphs[1], "the job, in plain words"
    demo, tests = blocks("sh")[:2]
    assert demo.splitlines() == [
        "python3 -m venv .venv",
        ".venv/bin/pip install .",
        ".venv/bin/meterlens demo",
    ]
    assert ".venv/bin/pip install -e '.[test]'\n.venv/bin/python -m pytest" in tests


def test_ci_runs_the_second_block_and_no_copy_of_it() -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert "readme_blocks.py 2" in script
    assert os.access(ROOT / ".ci" / "run", os.X_OK)
    code = [line for line in script.splitlines() if not line.lstrip().startswith("#")]
    assert not [line for line in code if "-m pytest" in line or ".[test]" in line]


@pytest.mark.parametrize("line", commands())
def test_shown_command_and_its_options_exist(line: str) -> None:
    words = shlex.split(line)[1:]
    context = click.Context(program, info_name="meterlens")
    if not words or words[0].startswith("-"):
        assert not words or words[0] in ("--help", "--version")
        return
    command = program.get_command(context, words[0])
    assert command, f"there is no command {words[0]}"
    known = {name for parameter in command.params for name in parameter.opts} | {"--help"}
    assert {word.split("=")[0] for word in words if word.startswith("--")} <= known
    with pytest.raises(click.exceptions.Exit) as left:
        command.make_context(words[0], [*words[1:], "--help"], parent=context)
    assert left.value.exit_code == 0


def test_it_shows_every_command() -> None:
    assert {shlex.split(line)[1] for line in commands() if " " in line} >= set(COMMANDS)


def test_five_minutes_example_runs(tmp_path: Path) -> None:
    make, ask = blocks("sh")[2:4]
    (tmp_path / "bin").mkdir()
    program_file = tmp_path / "bin" / "meterlens"
    program_file.write_text(f'#!/bin/sh\nexec "{sys.executable}" -m meterlens "$@"\n')
    program_file.chmod(0o755)
    paths = {"PATH": f"{program_file.parent}:{os.environ['PATH']}", "PYTHONPATH": str(ROOT)}

    def run(script: str) -> str:
        done = subprocess.run(
            ["sh", "-eu", "-c", script],
            cwd=tmp_path,
            env=os.environ | paths,
            capture_output=True,
            text=True,
            check=False,
        )
        assert done.returncode == 0, done.stdout + done.stderr
        return done.stdout

    assert make.splitlines()[0] == ". .venv/bin/activate"
    run("\n".join(make.splitlines()[1:]))
    assert (tmp_path / "mill" / "site.toml").is_file()
    (tmp_path / "mill" / "site.toml").write_text(blocks("toml")[0], encoding="utf-8")
    export = tmp_path / "mill" / "exports" / "main-2026-03.csv"
    export.write_text(blocks("csv")[0], encoding="utf-8")
    said = run(ask)
    # Worked by hand from V·I·PF of the seven whole rows: 269.7 kWh, 215.84 kW at 08:45, where
    # L1 takes 402.6 A of 400; the first five rows lag for 75 minutes.
    for figure in ("270", "215.8", "403", "101%", "low-pf", "1.25"):
        assert figure in said, figure
    assert (tmp_path / "mill" / "power.parquet").is_file()
    assert (tmp_path / "mill" / "reports" / "index.html").is_file()


def test_links_lead_somewhere() -> None:
    for page in ("README.md", "DEVELOPERS.md"):
        text = (ROOT / page).read_text(encoding="utf-8")
        for target in re.findall(r"\]\(([^)]+)\)", text):
            name, _, anchor = target.partition("#")
            linked = (ROOT / name) if name else ROOT / page
            assert linked.exists(), f"{page}: {target}"
            if anchor:
                headings = re.findall(r"^#+ (.*)$", linked.read_text("utf-8"), flags=re.MULTILINE)
                assert anchor in {h.lower().replace(" ", "-") for h in headings}, target


def test_column_dictionary_is_up_to_date() -> None:
    page = PAGE.read_text(encoding="utf-8")
    assert with_dictionary(page) == page, (
        "run: python tests/architecture/column_dictionary.py --write"
    )


def test_developers_page_names_files_that_exist() -> None:
    spans = re.findall(r"`([a-z_]+/[\w./*-]+)`", PAGE.read_text(encoding="utf-8"))
    assert len(spans) > 20
    for span in spans:
        found = list(ROOT.glob(span)) or list((ROOT / "meterlens").glob(span))
        assert found, span
