"""Small exports written by hand: quotes that hold marks and line ends, or never close."""

from __future__ import annotations

from pathlib import Path

import pytest
from small_site import SmallSite, counts, table

STAMPS = [f"2026-10-01T00:{minute:02d}" for minute in (0, 15, 30, 45)]
NUMBERS = [[f"{230 + n}.5", "231.25", "232", f"{10 + n}.125", "11.5", "0.75"] for n in range(4)]
ROWS: list[list[str]] = [
    ["Time", "Va", "Vb", "Vc", "Ia", "Ib", "Ic"],
    *([stamp, *row] for stamp, row in zip(STAMPS, NUMBERS, strict=True)),
]
PLAIN = table(ROWS)
WANTED = [[float(cell) for cell in row] for row in NUMBERS]
VALUE_COLUMNS = ("v_a", "v_b", "v_c", "i_a", "i_b", "i_c")


@pytest.fixture
def site(tmp_path: Path) -> SmallSite:
    """A site whose map leaves to the reader whatever it can find out."""
    return SmallSite(tmp_path).write()


def read_right(site: SmallSite, text: str) -> None:
    """All four rows are stored, with every value."""
    outcome = site.take(text)
    assert counts(outcome) == (4, 4, 0, 0, 0), outcome["rejects"]
    assert site.starts() == STAMPS
    assert site.stored(*VALUE_COLUMNS) == WANTED


def test_quoted_fields(site: SmallSite) -> None:
    """Everything quoted, some with spaces inside."""
    read_right(site, table([[f'"{cell}"' for cell in row] for row in ROWS]))


def test_quotes_hold_delimiters_quotes_and_line_ends(site: SmallSite) -> None:
    """A note with all three; line numbers of later rows are those of the file."""
    notes = ["Note, free", 'a, "b"', "two\nlines", "", "x"]
    rows = [
        [*row, '"' + note.replace('"', '""') + '"'] for row, note in zip(ROWS, notes, strict=True)
    ]
    lines = table(rows) + "torn\n"
    outcome = site.take(lines)
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == lines.count("\n")
    assert site.query("select line from interval order by line") == [[2], [3], [5], [6]]
    assert site.stored(*VALUE_COLUMNS) == WANTED


def test_lines_inside_quotes_before_the_header(site: SmallSite) -> None:
    """A quoted remark over two lines in the preamble does not hide the header."""
    read_right(site, '"Remark\nover two lines"\n' + PLAIN)


def test_lines_inside_quotes_before_a_stated_header(site: SmallSite) -> None:
    """`header_row` counts the lines of the file, also those inside quotes."""
    site.write(header_row=3)
    read_right(site, '"Remark\nover two lines"\n' + PLAIN)


def test_inch_mark_in_the_preamble(site: SmallSite) -> None:
    """A quote in the middle of a field is a character like any other."""
    read_right(site, 'Meter in a 19" rack\n' + PLAIN)


def test_stray_quote_costs_its_own_row(site: SmallSite) -> None:
    """A field that opens a quote and never closes it takes no other row with it."""
    lines = PLAIN.rstrip("\n").split("\n")
    outcome = site.take("\n".join([*lines[:2], '"torn,1,2,3,4,5,6', *lines[2:]]) + "\n")
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == 3


QUOTED = [[f'"{cell}"' for cell in row] for row in ROWS]
STRAY = ('"torn,1,2,3,4,5,6', '"torn', '"torn,"1","2","3","4","5","6"', '"1","2","torn')


@pytest.mark.parametrize("stray", STRAY)
@pytest.mark.parametrize("place", [2, 5])
def test_stray_quote_among_quoted_rows(site: SmallSite, stray: str, place: int) -> None:
    """The next row's first quote does not close it, nor does the end of the file."""
    lines = table(QUOTED).rstrip("\n").split("\n")
    outcome = site.take("\n".join([*lines[:place], stray, *lines[place:]]) + "\n")
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == place + 1
    assert site.stored(*VALUE_COLUMNS) == WANTED


def test_stray_quote_far_from_the_next(site: SmallSite) -> None:
    """Many short lines after it: they stand for themselves."""
    outcome = site.take(PLAIN + '"torn\n' + "x\n" * 50 + 'y"\n')
    assert counts(outcome) == (56, 4, 0, 0, 52)


def test_note_over_lines_in_the_first_column(site: SmallSite) -> None:
    """The last line of the note looks like a whole row, but for its quote."""
    rows = [['"Note"' if n == 0 else '"two\nlines"', *row] for n, row in enumerate(ROWS)]
    read_right(site, table(rows))


def test_header_over_two_lines(site: SmallSite) -> None:
    """A line end inside a column's name is a blank."""
    site.write(v_a="U L1 [V]")
    read_right(site, PLAIN.replace("Va", '"U L1\n[V]"', 1))
