"""What people and scripts see: JSON on stdout, tables, notes on stderr."""

from __future__ import annotations

import json
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from datetime import date, datetime
from functools import wraps
from pathlib import Path
from typing import Any

import click

from meterlens.settings import Site, load_site
from meterlens.studies.findings import counted

__all__ = [
    "number",
    "phase_labels",
    "print_json",
    "print_rows",
    "print_table",
    "progress_over",
    "say",
    "site_options",
    "tell",
]


_MOST_ROWS = 200
_MOST_BLOCKS = 10


def site_options(function: Callable[..., Any]) -> Callable[..., Any]:
    """Give a command ``--site`` and ``--json``; it gets the loaded site."""

    @click.option(
        "--site",
        "folder",
        type=click.Path(path_type=Path),
        metavar="DIR",
        help="The site's folder; left out, the nearest one upward.",
    )
    @click.option("--json", "as_json", is_flag=True, help="Print one JSON document.")
    @wraps(function)
    def command(folder: Path | None, as_json: bool, **arguments: Any) -> Any:
        return function(site=load_site(folder), as_json=as_json, **arguments)

    return command


def tell(sentence: str) -> None:
    """A note for people, on stderr."""
    print(f"meterlens: {sentence}", file=sys.stderr)


def say(text: str = "") -> None:
    """A line of the result, as plain text: markup in names stays text."""
    _console().print(text, markup=False, highlight=False, soft_wrap=False)


def print_json(document: dict[str, Any]) -> None:
    """One JSON document on stdout; nothing that is not a number passes for one."""
    readable = (sys.stdout.encoding or "ascii").lower().startswith("utf")
    text = json.dumps(
        document, ensure_ascii=not readable, allow_nan=False, indent=1, default=_plain
    )
    sys.stdout.write(text + "\n")


def _plain(x: object) -> object:
    if isinstance(x, datetime):
        return x.isoformat()
    if isinstance(x, date):
        return x.isoformat()
    return str(x)


def number(x: float | None, digits: int = 0, *, percent: bool = False) -> str:
    """A number for a table; a dash where it is not known."""
    if x is None:
        return "–"
    return f"{x:.{digits}%}" if percent else f"{x:,.{digits}f}"


def print_table(
    title: str,
    headings: Sequence[str],
    rows: Sequence[Sequence[str]],
    *,
    left: Sequence[int] = (0,),
    wrapped: Sequence[int] = (),
) -> None:
    """A table that fits 80 columns.

    Parameters
    ----------
    title : str
    headings : sequence of str
    rows : sequence of sequences of str
        Cells as they are to be read.
    left : sequence of int
        Columns that hold words; the others are set flush right.
    wrapped : sequence of int
        Columns that may run over several lines.
    """
    from rich import box
    from rich.table import Table
    from rich.text import Text

    table = Table(
        title=Text(title),
        title_justify="left",
        title_style="bold",
        box=box.SIMPLE_HEAD,
        pad_edge=False,
        padding=(0, 1),
        collapse_padding=True,
    )
    for place, heading in enumerate(headings):
        words = place in left or place in wrapped
        table.add_column(
            Text(heading),
            justify="left" if words else "right",
            # Numbers keep their line: words give way where the table is too wide.
            no_wrap=not words,
            overflow="fold",
        )
    for row in rows:
        table.add_row(*(Text(_harmless(cell)) for cell in row))
    _console().print(table)


def print_rows(names: Sequence[str], rows: Sequence[Sequence[Any]]) -> None:
    """Rows of any query: a table where it fits, else a block of lines for each row."""
    console = _console()
    shown = [[_cell(x) for x in row] for row in rows[:_MOST_ROWS]]
    widths = [max([len(name), *(len(row[k]) for row in shown)]) for k, name in enumerate(names)]
    if sum(widths) + 2 * len(widths) <= console.width:
        words = [
            k for k in range(len(names)) if not all(isinstance(r[k], int | float) for r in rows)
        ]
        print_table(counted(len(rows), "row"), names, shown, left=words)
    else:
        shown = shown[:_MOST_BLOCKS]
        say(counted(len(rows), "row"))
        edge = max(map(len, names), default=0)
        for row in shown:
            say()
            for name, cell in zip(names, row, strict=True):
                say(_harmless(f"{name:<{edge}}  {cell}"))
    if len(rows) > len(shown):
        say(f"The first {len(shown)} rows; --json prints all.")


def _cell(x: object) -> str:
    if x is None:
        return ""
    if isinstance(x, float):
        return f"{x:.7g}"
    if isinstance(x, list):
        return ", ".join(map(str, x))
    return str(x)


def _harmless(cell: str) -> str:
    """Control characters, terminal escapes among them, as visible marks."""
    return "".join(c if c.isprintable() or c == "\n" else "\N{REPLACEMENT CHARACTER}" for c in cell)


def _console() -> Any:
    from rich.console import Console

    wide = sys.stdout.isatty()
    return Console(file=sys.stdout, width=None if wide else 80, highlight=False)


@contextmanager
def progress_over(what: str, total: int) -> Iterator[Callable[[str], None]]:
    """A progress bar on stderr where that is a terminal; call it with each item's name."""
    if not sys.stderr.isatty() or total < 2:
        yield lambda _: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn

    columns = (TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task(what, total=total)

        def advance(name: str) -> None:
            bar.update(task, advance=1, description=f"{what} {name}")

        yield advance


def phase_labels(site: Site) -> dict[str, tuple[str, str, str]]:
    """Service id → what the site calls its phases a, b, c."""
    return {service.id: service.phase_labels for service in site.services}
