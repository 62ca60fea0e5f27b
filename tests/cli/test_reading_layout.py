"""Small exports written by hand: preambles, units rows, headers, numbered columns, two stamps."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from small_site import VALUES, SmallSite, counts, table

NAMES = ["Time", "Va", "Vb", "Vc", "Ia", "Ib", "Ic"]
STAMPS = [f"2026-10-01T00:{minute:02d}" for minute in (0, 15, 30, 45)]
ROWS: list[list[Any]] = [[stamp, 230.5, 231, 232, 10 + n, 11, 12] for n, stamp in enumerate(STAMPS)]
BODY = table(ROWS, ";")
HEADER = table([NAMES], ";")
PREAMBLE = "Report;;;;;;\nMeter;77;;;;;\n\nPeriod;15 min\n"
UNITS = ";V;V;V;A;A;A\n"


@pytest.fixture
def site(tmp_path: Path) -> SmallSite:
    """A site with the usual map."""
    return SmallSite(tmp_path).write()


def read_right(site: SmallSite, text: str, first_line: int) -> None:
    """All four rows are stored, from the line where they stand."""
    outcome = site.take(text)
    assert counts(outcome) == (4, 4, 0, 0, 0), outcome["rejects"]
    assert outcome["values_rejected"] == 0
    assert site.starts() == STAMPS
    assert site.stored("v_a", "i_a", "line") == [
        [230.5, 10.0 + n, first_line + n] for n in range(4)
    ]


@pytest.mark.parametrize("stated", [True, False])
def test_preamble(site: SmallSite, stated: bool) -> None:
    """Lines before the header, a blank one among them."""
    site.write(header_row=5 if stated else None)
    read_right(site, PREAMBLE + HEADER + BODY, 6)


@pytest.mark.parametrize("units_row", [True, None])
@pytest.mark.parametrize("header_row", [5, None])
def test_units_row(site: SmallSite, units_row: bool | None, header_row: int | None) -> None:
    """Stated or found; it is no row."""
    site.write(header_row=header_row, units_row=units_row)
    read_right(site, PREAMBLE + HEADER + UNITS + BODY, 7)


@pytest.mark.parametrize("units_row", [False, None])
def test_no_units_row(site: SmallSite, units_row: bool | None) -> None:
    """Stated or found."""
    site.write(units_row=units_row)
    read_right(site, HEADER + BODY, 2)


def test_units_row_that_the_map_denies(site: SmallSite) -> None:
    """It is a row without a time then."""
    site.write(units_row=False)
    outcome = site.take(HEADER + UNITS + BODY)
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert (outcome["rejects"][0]["line"], outcome["rejects"][0]["column"]) == (2, None)


def test_first_row_without_a_measurement_is_no_units_row(site: SmallSite) -> None:
    """A stamp and dashes: read and rejected."""
    outcome = site.take(HEADER + "2026-09-30T23:45;---;---;---;---;---;---\n" + BODY)
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert "measurement" in outcome["rejects"][0]["reason"]


def test_spaces_around_names_and_cells(site: SmallSite) -> None:
    """Padding means nothing."""
    padded = (HEADER + BODY).replace(";", " ; ")
    read_right(site, padded, 2)


def test_delimiter_at_the_end_of_every_row(site: SmallSite) -> None:
    """One empty field more than the header has."""
    read_right(site, HEADER + BODY.replace("\n", ";\n"), 2)


def test_other_columns_do_not_matter(site: SmallSite) -> None:
    """Unmapped columns, words in them, in any order."""
    rows = [[row[6], "note", *row[:6]] for row in ROWS]
    read_right(site, table([["Ic", "Remark", *NAMES[:6]], *rows], ";"), 2)


NUMBERED = {"timestamp": 1} | {key: place for place, key in enumerate(VALUES, 2)}


@pytest.mark.parametrize("delimiter", [";", "\t", "|", ","])
def test_columns_by_number(site: SmallSite, delimiter: str) -> None:
    """`header_row = 0`: the first line is a row."""
    site.write(NUMBERED, header_row=0)
    read_right(site, table(ROWS, delimiter), 1)


@pytest.mark.parametrize("delimiter", [";", "\t", "|"])
def test_columns_by_number_with_decimal_commas(site: SmallSite, delimiter: str) -> None:
    """As many commas as delimiters: the comma still is none."""
    site.write(NUMBERED, header_row=0)
    rows = [[stamp, *(f"{float(x):.1f}" for x in cells)] for stamp, *cells in ROWS]
    read_right(site, table(rows, delimiter).replace(".", ","), 1)


def test_number_beyond_the_last_column(site: SmallSite) -> None:
    """A mapped column that no row has is an error, not a column of holes."""
    site.write(NUMBERED | {"i_c": 9}, header_row=0)
    ran = site.run("ingest", site.export(BODY))
    assert (ran.code, ran.out) == (1, "")
    assert "i_c" in ran.err
    assert "9" in ran.err


TWO: list[list[Any]] = [
    ["Date", "Clock", *NAMES[1:]],
    *([*str(row[0]).split("T"), *row[1:]] for row in ROWS),
]


@pytest.mark.parametrize("stated", [True, False])
def test_two_column_stamps(site: SmallSite, stated: bool) -> None:
    """Date and time apart, joined by one space."""
    pattern = "%Y-%m-%d %H:%M" if stated else None
    site.write(timestamp=["Date", "Clock"], timestamp_format=pattern)
    read_right(site, table(TWO, ";"), 2)


def test_two_column_stamps_by_number(site: SmallSite) -> None:
    """And without a header."""
    site.write(
        {"timestamp": [1, 2]} | {key: place for place, key in enumerate(VALUES, 3)}, header_row=0
    )
    read_right(site, table(TWO[1:], ";"), 1)


FORMATS = (
    ("%d.%m.%Y %H:%M", "01.10.2026 00:{:02d}"),
    ("%m/%d/%Y %I:%M %p", "10/01/2026 12:{:02d} AM"),
    ("%d-%b-%y %H:%M:%S", "01-Oct-26 00:{:02d}:00"),
    ("%Y%m%d%H%M", "2026100100{:02d}"),
    (None, "2026-10-01 00:{:02d}"),
    (None, "2026-10-01T00:{:02d}:00"),
    (None, "2026-10-01T00:{:02d}:00.000"),
    (None, "2026-10-01T00:{:02d}:00Z"),
)


@pytest.mark.parametrize(("pattern", "stamp"), FORMATS)
def test_time_formats(site: SmallSite, pattern: str | None, stamp: str) -> None:
    """Formats of the map, and ISO 8601 where it names none."""
    site.write(timestamp_format=pattern)
    rows = [[stamp.format(15 * n), *row[1:]] for n, row in enumerate(ROWS)]
    read_right(site, table([NAMES, *rows], ";"), 2)


def test_epoch(site: SmallSite) -> None:
    """Seconds since 1970: 1 790 812 800 is 2026-10-01 00:00 UTC."""
    site.write(timestamp_format="epoch")
    rows = [[1790812800 + 900 * n, *row[1:]] for n, row in enumerate(ROWS)]
    read_right(site, table([NAMES, *rows], ";"), 2)


@pytest.mark.parametrize("year", ["0206", "9999", "1969", "2100"])
def test_year_with_a_wrong_digit_is_no_time(site: SmallSite, year: str) -> None:
    """One torn digit must not stretch the record over centuries."""
    torn = BODY.splitlines()[0].replace("2026", year)
    outcome = site.take(HEADER + BODY + torn + "\n")
    assert counts(outcome) == (5, 4, 0, 0, 1)
    assert "time" in outcome["rejects"][0]["reason"]


def test_missing_words_and_scale(site: SmallSite) -> None:
    """Words for a missing value, one of them a number; a factor as read."""
    site.write(missing=["---", "-999", ""], scale={"i_a": 1000, "v_a": 0.5})
    rows = [
        [STAMPS[0], 461, 231, 232, 0.01, "---", 12],
        [STAMPS[1], "-999", 231, 232, "", 11, "-999"],
    ]
    outcome = site.take(table([NAMES, *rows], ";"))
    assert counts(outcome) == (2, 2, 0, 0, 0)
    assert outcome["values_rejected"] == 0
    assert site.stored("v_a", "i_a", "i_b", "i_c") == [
        [230.5, 10.0, None, 12.0],
        [None, None, 11.0, None],
    ]


def test_impossible_values_are_blank_and_named(site: SmallSite) -> None:
    """Below zero or not finite; the rest of the row is good."""
    rows = [
        [STAMPS[0], -230, 231, 232, 10, "inf", 12],
        [STAMPS[1], 230, "nan", 232, 10, "1e999", 12],
        [STAMPS[2], 230, 231, 232, -0.5, 11, 12],
    ]
    outcome = site.take(table([NAMES, *rows], ";"))
    assert counts(outcome) == (3, 3, 0, 0, 0)
    assert outcome["values_rejected"] == 5
    assert sorted((r["line"], r["column"]) for r in outcome["rejects"]) == [
        (2, "i_b"), (2, "v_a"), (3, "i_b"), (3, "v_b"), (4, "i_a"),
    ]  # fmt: skip
    assert site.stored("v_a", "v_b", "i_a", "i_b") == [
        [None, 231.0, 10.0, None],
        [230.0, None, 10.0, None],
        [230.0, 231.0, None, 11.0],
    ]


def test_reason_follows_the_scaled_sign(site: SmallSite) -> None:
    """Meters that print load currents negative; a positive one is negative then."""
    site.write(scale={"i_a": -1})
    rows = [
        [stamp, 230, 231, 232, i, 11, 12] for stamp, i in zip(STAMPS, (-5, 5, -6, "x"), strict=True)
    ]
    outcome = site.take(table([NAMES, *rows], ";"))
    assert [(r["line"], r["reason"]) for r in outcome["rejects"]] == [
        (3, "a negative current"), (5, "not a finite number"),
    ]  # fmt: skip
    assert site.stored("i_a") == [[5.0], [None], [6.0], [None]]


def test_reason_of_a_grouped_negative_number(site: SmallSite) -> None:
    """Marks within the number do not hide its sign."""
    site.write(decimal=",", thousands=".")
    rows = [[stamp, 230, 231, 232, "-1.234,5", 11, 12] for stamp in STAMPS]
    outcome = site.take(table([NAMES, *rows], ";"))
    assert {r["reason"] for r in outcome["rejects"]} == {"a negative current"}


def test_rows_with_a_wrong_number_of_fields(site: SmallSite) -> None:
    """Cut off, or with one too many."""
    rows = BODY.splitlines()
    outcome = site.take(HEADER + "\n".join([*rows[:2], rows[2][:20], rows[3] + ";5"]) + "\n")
    assert counts(outcome) == (4, 2, 0, 0, 2)
    assert [(r["line"], "fields" in r["reason"]) for r in outcome["rejects"]] == [
        (4, True), (5, True),
    ]  # fmt: skip
