"""The code blocks of README.md.

    python tests/architecture/readme_blocks.py 2

prints the second `sh` block, for scripts that run what the README says.
"""

from __future__ import annotations

import re
import sys
from pathlib import Path

__all__ = ["README", "blocks", "commands"]

README = Path(__file__).resolve().parents[2] / "README.md"


def blocks(language: str) -> list[str]:
    """Blocks of one language, in order, with their line ends."""
    text = README.read_text(encoding="utf-8")
    return re.findall(rf"^```{language}\n(.*?)^```$", text, flags=re.DOTALL | re.MULTILINE)


def commands() -> list[str]:
    """Every `meterlens …` that the README shows, in a block or within a sentence."""
    lines = [line.strip() for block in blocks("sh") for line in block.splitlines()]
    prose = re.sub(r"^```.*?^```$", "", README.read_text("utf-8"), flags=re.DOTALL | re.MULTILINE)
    spans = [" ".join(span.split()) for span in re.findall(r"`([^`]+)`", prose)]
    shown = [re.sub(r"^\.venv/bin/", "", line) for line in [*lines, *spans]]
    return [line for line in shown if re.match(r"meterlens( |$)", line)]


if __name__ == "__main__":
    print(blocks("sh")[int(sys.argv[1]) - 1], end="")
