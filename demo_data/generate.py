"""Write the demo site's exports, `planted.json` and README, the same bytes every time.

Run as ``python demo_data/generate.py [--out DIR]``.
"""

from __future__ import annotations

import argparse
from pathlib import Path

from generator.documents import planted_json, readme
from generator.meters import exports
from generator.services import records


def write(folder: Path) -> None:
    """Write everything that is generated into a folder."""
    true_records = records()
    made = exports(true_records)
    (folder / "exports").mkdir(parents=True, exist_ok=True)
    for export in made:
        export.write(folder / "exports")
    for name, text in (
        ("planted.json", planted_json(true_records, made)),
        ("README.md", readme(true_records, made)),
    ):
        (folder / name).write_bytes(text.encode("utf-8"))


def main() -> None:
    """Read the command line and write."""
    parser = argparse.ArgumentParser(description="Write the demo site's files.")
    parser.add_argument("--out", type=Path, default=Path(__file__).resolve().parent, metavar="DIR")
    write(parser.parse_args().out)


if __name__ == "__main__":
    main()
