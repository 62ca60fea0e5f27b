"""Small exports written by hand: delimiters, number spellings, encodings, line ends, quotes."""

from __future__ import annotations

from pathlib import Path

import pytest
from small_site import VALUES, SmallSite, counts, table

NAMES: list[object] = ["Time", "Va", "Vb", "Vc", "Ia", "Ib", "Ic"]
STAMPS = [f"2026-10-01T00:{minute:02d}" for minute in (0, 15, 30, 45)]
NUMBERS = [[f"{230 + n}.5", "231.25", "232", f"{10 + n}.125", "11.5", "0.75"] for n in range(4)]
ROWS: list[list[str]] = [
    list(map(str, NAMES)),
    *([stamp, *row] for stamp, row in zip(STAMPS, NUMBERS, strict=True)),
]
PLAIN = table(ROWS)
WANTED = [[float(cell) for cell in row] for row in NUMBERS]
VALUE_COLUMNS = ("v_a", "v_b", "v_c", "i_a", "i_b", "i_c")


@pytest.fixture
def site(tmp_path: Path) -> SmallSite:
    """A site whose map leaves to the reader whatever it can find out."""
    return SmallSite(tmp_path).write()


def notes_on(site: SmallSite, text: str | bytes) -> str:
    """What the reader says that it assumed."""
    ran = site.run("ingest", "--json", site.export(text))
    assert ran.code == 0, ran.err
    return " ".join(note["reason"] for note in ran.document["notes"])


def read_right(site: SmallSite, text: str | bytes, encoding: str = "utf-8") -> None:
    """All four rows are stored, with every value."""
    outcome = site.take(text, encoding=encoding)
    assert counts(outcome) == (4, 4, 0, 0, 0), outcome["rejects"]
    assert outcome["values_rejected"] == 0
    assert site.starts() == STAMPS
    assert site.stored(*VALUE_COLUMNS) == WANTED


@pytest.mark.parametrize("delimiter", [";", ",", "\t", "|"])
@pytest.mark.parametrize("stated", [True, False])
def test_delimiters(site: SmallSite, delimiter: str, stated: bool) -> None:
    """Stated or found."""
    site.write(delimiter=delimiter if stated else None)
    read_right(site, table(ROWS, delimiter))


@pytest.mark.parametrize("delimiter", [";", "\t", "|"])
@pytest.mark.parametrize("stated", [True, False])
def test_decimal_commas(site: SmallSite, delimiter: str, stated: bool) -> None:
    """Beside each delimiter that leaves the comma free."""
    site.write(decimal="," if stated else None)
    read_right(site, table(ROWS, delimiter).replace(".", ","))


def test_decimal_commas_in_quotes(site: SmallSite) -> None:
    """A comma delimits and, inside quotes, divides."""
    rows = [[f'"{cell.replace(".", ",")}"' for cell in row] for row in ROWS]
    read_right(site, table(rows))


THOUSANDS = (
    (";", "1.234,5", ",", "."),
    (";", "1'234.5", ".", "'"),
    (";", "1’234.5", ".", "’"),
    (";", "1 234,5", ",", " "),
    (";", "1\u00a0234,5", ",", "\u00a0"),
    (";", "1\u202f234,5", ",", "\u202f"),
    (";", "1,234.5", ".", ","),
    (",", '"1,234.5"', ".", ","),
    ("\t", "1 234.5", ".", " "),
)


@pytest.mark.parametrize(("delimiter", "printed", "decimal", "mark"), THOUSANDS)
@pytest.mark.parametrize("stated", [True, False])
def test_thousands(
    site: SmallSite, delimiter: str, printed: str, decimal: str, mark: str, stated: bool
) -> None:
    """Grouped numbers beside ungrouped ones and signs."""
    site.write(decimal=decimal if stated else None, thousands=mark if stated else None)
    rows: list[list[object]] = [NAMES]
    for stamp in STAMPS:
        small = f"230{decimal}25"
        quoted = f'"{small}"' if decimal == delimiter else small
        rows.append([stamp, quoted, quoted, quoted, printed, "999", f"12{decimal}5"])
    outcome = site.take(table(rows, delimiter))
    assert counts(outcome) == (4, 4, 0, 0, 0)
    assert outcome["values_rejected"] == 0, outcome["rejects"]
    assert site.stored("v_a", "i_a", "i_b", "i_c") == [[230.25, 1234.5, 999.0, 12.5]] * 4


def test_broken_numbers_are_told(site: SmallSite) -> None:
    """A mark that does not group by three makes no number: never a silent guess."""
    site.write(decimal=",", thousands=".")
    broken = ["1.23.4,5", "12.34,5", "1.2345,5", "1,5,5", "1.5", "abc", "5A", "1_000", "0x10"]
    rows: list[list[object]] = [
        [f"2026-10-01T{n:02d}:00", "230,5", "231", "232", printed, "1", "2"]
        for n, printed in enumerate(["1.234,5", *broken])
    ]
    outcome = site.take(table([NAMES, *rows], ";"))
    assert counts(outcome) == (10, 10, 0, 0, 0)
    assert outcome["values_rejected"] == 9
    assert [(r["line"], r["column"], r["text"]) for r in outcome["rejects"]] == [
        (line, "i_a", printed) for line, printed in enumerate(broken, 3)
    ]
    assert site.stored("i_a") == [[1234.5], *[[None]] * 9]


ACCENTED = "Größe,Va,Vb,Vc,Ia,Ib,Ic" + PLAIN[PLAIN.index("\n") :]
ENCODINGS = (
    ("utf-8", None),
    ("utf-8-sig", None),
    ("utf-8-sig", "utf-8"),
    ("cp1252", None),
    ("cp1252", "cp1252"),
    ("latin-1", "latin-1"),
    ("utf-16", None),
    ("utf-16", "utf-16"),
    ("utf-16-le", "utf-16-le"),
    ("utf-16-be", "utf-16-be"),
    ("cp1250", "cp1250"),
)


@pytest.mark.parametrize(("written", "named"), ENCODINGS)
def test_encodings(site: SmallSite, written: str, named: str | None) -> None:
    """A column with an umlaut is found in each, whatever ends the lines."""
    site.write(timestamp="Größe", encoding=named)
    end = {"utf-8": "\r", "cp1252": "\n", "utf-16": "\r"}.get(written, "\r\n")
    read_right(site, ACCENTED.replace("\n", end).encode(written))


@pytest.mark.parametrize("written", ["utf-8-sig", "utf-16", "utf-8"])
def test_byte_order_mark_without_a_header(site: SmallSite, written: str) -> None:
    """The mark is no part of the first stamp."""
    numbered = {key: place for place, key in enumerate(VALUES, 2)}
    site.write(numbered, timestamp=1, header_row=0)
    read_right(site, PLAIN.partition("\n")[2].encode(written))


def test_accent_as_the_very_last_byte(site: SmallSite) -> None:
    """A Windows file that ends in a lone accented letter is no broken UTF-8."""
    rows = [[*row, "note" if n == 0 else "é"] for n, row in enumerate(ROWS)]
    read_right(site, table(rows).rstrip("\n").encode("cp1252"))


def test_one_broken_byte_costs_one_row_at_most(site: SmallSite) -> None:
    """A transmission fault in one row leaves the others readable."""
    site.write(timestamp="Größe")
    broken = ACCENTED.encode().replace(b"231.5,231.25", b"231.5,2\xff\x8131")
    outcome = site.take(broken)
    assert outcome["rows_read"] == 4
    assert outcome["rows_rejected"] + outcome["values_rejected"] == 1


def test_broken_byte_is_noted(site: SmallSite) -> None:
    """What was assumed of the encoding stands in the notes."""
    site.write(timestamp="Größe")
    assert "UTF-8" in notes_on(site, ACCENTED.encode() + b"\xff\n")
    assert "read as cp1252" in notes_on(site, ACCENTED.encode("cp1252"))


@pytest.mark.parametrize("shift", [0, 1])
def test_accent_over_the_end_of_a_chunk(site: SmallSite, shift: int) -> None:
    """Bytes are read a mebibyte at a time; a letter of two may lie over its end."""
    remark = "x" * ((1 << 20) - shift) + "é\n" + "x" * (1 << 20) + "\n"
    read_right(site, remark + PLAIN)


def test_half_a_letter_before_plain_text(site: SmallSite) -> None:
    """The first byte of a pair ends a chunk, and all that follows is ASCII: no UTF-8."""
    padding = b"x" * ((1 << 20) - 1) + "é".encode("cp1252")
    body = [[*row, "Note" if n == 0 else "x"] for n, row in enumerate(ROWS)]
    read_right(site, padding + b"\n" + table(body).encode("cp1252"))


def test_separators_of_the_machine_are_blanks(site: SmallSite) -> None:
    """Control characters that the reader uses itself, in a note."""
    rows = [[*row, "Note" if n == 0 else "a\x1db"] for n, row in enumerate(ROWS)]
    read_right(site, table(rows))


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("last", [True, False])
def test_line_ends(site: SmallSite, end: str, last: bool) -> None:
    """With and without one at the end of the file."""
    read_right(site, PLAIN.replace("\n", end) if last else PLAIN.replace("\n", end)[: -len(end)])


def test_mixed_line_ends(site: SmallSite) -> None:
    """Lines are counted alike whatever ends them."""
    lines = PLAIN.rstrip("\n").split("\n")
    broken = [*lines[:3], "torn", *lines[3:]]
    ends = ["\r\n", "\n", "\r", "\n", "\r\n", ""]
    outcome = site.take("".join(a + b for a, b in zip(broken, ends, strict=True)))
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == 4
    assert site.stored(*VALUE_COLUMNS) == WANTED


def test_blank_lines_are_no_rows(site: SmallSite) -> None:
    """Blank lines and lines of blanks count as lines, not as rows."""
    lines = PLAIN.rstrip("\n").split("\n")
    outcome = site.take("\n".join([*lines[:2], "", "   ", *lines[2:], "torn", "", ""]))
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == 8


def test_long_first_line(site: SmallSite) -> None:
    """A preamble of one endless line."""
    read_right(site, "x" * 300_000 + "\n" + PLAIN)


@pytest.mark.parametrize(
    ("cells", "is_noted"),
    [
        (["1.234", "987", "12"], True),
        (["1.234", "987.5", "12"], False),
        (["1.234", "987.125", "12.500"], False),
        (["1.234", "0.987", "12"], False),
        (["1.234", "9876", "12"], False),
    ],
)
def test_point_that_may_group_thousands(site: SmallSite, cells: list[str], is_noted: bool) -> None:
    """It is read as a decimal point, and said where nothing settles it."""
    site.write({key: VALUES[key] for key in ("i_a", "i_b", "i_c")})
    rows = [["Time", "Ia", "Ib", "Ic"], *([stamp, *cells] for stamp in STAMPS)]
    assert ("thousands" in notes_on(site, table(rows, ";"))) == is_noted
    assert site.stored("i_a") == [[1.234]] * 4


@pytest.mark.parametrize("name", ["export (1).csv", "export[1].csv", "ex{p,q}ort.csv", "é.csv"])
def test_file_names_are_names(site: SmallSite, name: str) -> None:
    """No character of a file's name means anything but itself."""
    assert counts(site.take(PLAIN, name)) == (4, 4, 0, 0, 0)


@pytest.mark.parametrize("name", ["export*.csv", "expor?.csv", "line=3/export.csv", "log.csv.gz"])
def test_file_names_with_a_meaning_elsewhere(site: SmallSite, name: str) -> None:
    """Not even a star, a question mark, a key with a value, or a packer's ending."""
    november = PLAIN.replace("2026-10", "2026-11")
    site.export(november, "exports.csv")
    assert counts(site.take(PLAIN, name)) == (4, 4, 0, 0, 0)
    assert site.starts() == STAMPS
