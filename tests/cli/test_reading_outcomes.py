"""Small exports written by hand: what becomes of rows that meet others, in a file and across files.

What should stand afterwards was worked out on paper: a later line wins value by value, a
missing value erases nothing, and a file whose map was corrected is as if it had never been
read before it is read again.
"""

from __future__ import annotations

from pathlib import Path

import pytest
from small_site import SmallSite, counts

Row = tuple[str, object, object]
HISTORY = (
    "select strftime(start_utc, '%H:%M'), v_a, i_a, replaced_by_line from history "
    "order by start_utc, replaced_by_file_id, replaced_by_line"
)


def export(*rows: Row, date: str = "2026-10-01") -> str:
    """Rows of clock reading, voltage and current of phase a; the others stay the same."""
    lines = [f"{date}T{clock},{v},231,232,{i},11,12\n" for clock, v, i in rows]
    return "Time,Va,Vb,Vc,Ia,Ib,Ic\n" + "".join(lines)


A = export(("00:00", 230, 10), ("00:15", 230, ""), ("00:30", 230, 10))
B = export(("00:00", 240, 20), ("00:15", "", 20), ("00:45", 240, 20))


@pytest.fixture
def site(tmp_path: Path) -> SmallSite:
    """A site with the usual map and a stated interval."""
    return SmallSite(tmp_path).write(interval_min=15)


def stands(site: SmallSite) -> list[list[object]]:
    """Clock reading, voltage and current of every stored interval."""
    return [[start[11:16], v, i] for start, v, i in site.stored("start_utc", "v_a", "i_a")]


def test_duplicates_in_one_file(site: SmallSite) -> None:
    """Equal rows change nothing, however often they come."""
    outcome = site.take(export(("00:00", 230, 10), ("00:15", 230, 10), *[("00:00", 230, 10)] * 3))
    assert counts(outcome) == (5, 2, 0, 3, 0)
    assert stands(site) == [["00:00", 230.0, 10.0], ["00:15", 230.0, 10.0]]
    assert site.query(HISTORY) == []


def test_later_line_wins_in_one_file(site: SmallSite) -> None:
    """Every earlier version goes to the history."""
    rows: list[Row] = [("00:00", 230, 10), ("00:15", 1, 1), ("00:00", 231, 10), ("00:00", 231, 12)]
    outcome = site.take(export(*rows))
    assert counts(outcome) == (4, 2, 2, 0, 0)
    assert stands(site) == [["00:00", 231.0, 12.0], ["00:15", 1.0, 1.0]]
    assert site.query(HISTORY) == [["00:00", 230.0, 10.0, 4], ["00:00", 231.0, 10.0, 5]]


def test_filling_in_one_file(site: SmallSite) -> None:
    """A row that only fills is stored; one that fills and changes replaces; holes erase nothing."""
    rows: list[Row] = [
        ("00:00", 230, ""), ("00:15", 230, ""), ("00:00", "", 10), ("00:15", 231, 10),
        ("00:00", "", ""), ("00:00", 230, ""),
    ]  # fmt: skip
    outcome = site.take(export(*rows))
    assert counts(outcome) == (6, 3, 1, 2, 0)
    assert stands(site) == [["00:00", 230.0, 10.0], ["00:15", 231.0, 10.0]]
    assert site.query(HISTORY) == [["00:15", 230.0, None, 5]]


def test_across_two_files(site: SmallSite) -> None:
    """Replaced, filled and stored, each counted by the second file."""
    assert counts(site.take(A, "a.csv")) == (3, 3, 0, 0, 0)
    assert counts(site.take(B, "b.csv")) == (3, 2, 1, 0, 0)
    assert stands(site) == [
        ["00:00", 240.0, 20.0],
        ["00:15", 230.0, 20.0],
        ["00:30", 230.0, 10.0],
        ["00:45", 240.0, 20.0],
    ]
    assert site.query(HISTORY) == [["00:00", 230.0, 10.0, 2]]


def test_known_file_changes_nothing(site: SmallSite) -> None:
    """Not even where another file has replaced its readings since; a copy is the same file."""
    torn = A + "torn\n"
    site.take(torn, "a.csv")
    site.take(B, "b.csv")
    before = site.contents()
    assert counts(site.take(torn, "copy.csv")) == (4, 0, 0, 3, 1)
    assert site.contents() == before


@pytest.mark.parametrize("first", ["quarters", "halves"])
def test_other_length_is_rejected(site: SmallSite, first: str) -> None:
    """An interval that lies over a stored one of another length, whichever came first."""
    clocks = {"quarters": ("00:00", "00:15", "00:30", "00:45"), "halves": ("00:30", "01:00")}
    files = {name: export(*((clock, 230, 10) for clock in clocks[name])) for name in clocks}
    second = "halves" if first == "quarters" else "quarters"
    minutes = {"quarters": 15, "halves": 30}
    site.write(interval_min=minutes[first])
    outcome = site.take(files[first], f"{first}.csv")
    assert outcome["rows_stored"] == len(clocks[first])
    site.write(interval_min=minutes[second])
    outcome = site.take(files[second], f"{second}.csv")
    # Halves over quarters: 00:30 lies over two, 01:00 is free. Quarters over halves: 00:30
    # and 00:45 lie over one, 00:00 and 00:15 are free.
    wanted = {"halves": (2, 1, 0, 0, 1), "quarters": (4, 2, 0, 0, 2)}
    assert counts(outcome) == wanted[second]
    assert all("interval" in reject["reason"] for reject in outcome["rejects"])
    starts = [start for start, *_ in stands(site)]
    assert starts == ["00:00", "00:15", "00:30", *(["00:45"] * (first == "quarters")), "01:00"]


def test_row_off_the_beat_is_rejected(site: SmallSite) -> None:
    """Within a file the earlier line holds the place."""
    outcome = site.take(export(("00:00", 1, 1), ("00:15", 2, 2), ("00:07", 3, 3), ("00:30", 4, 4)))
    assert counts(outcome) == (4, 3, 0, 0, 1)
    assert outcome["rejects"][0]["line"] == 4


def test_out_of_order_blocks(site: SmallSite) -> None:
    """The order of the lines does not matter where no interval comes twice."""
    clocks = ["01:00", "01:15", "00:30", "00:45", "02:00", "00:00", "00:15"]
    outcome = site.take(export(*((clock, 230, n) for n, clock in enumerate(clocks))))
    assert counts(outcome) == (7, 7, 0, 0, 0)
    order = sorted(range(7), key=lambda n: clocks[n])
    assert stands(site) == [[clocks[n], 230.0, float(n)] for n in order]


def test_corrected_map_replaces_the_earlier_ingest(site: SmallSite) -> None:
    """Rows, rejects, history and the file's own record: as if read once."""
    text = export(("00:00", 230, 10), ("00:00", 231, 10), ("00:15", 230, -1)) + "torn\n"
    site.take(text)
    site.write(interval_min=15, scale={"v_a": 2.0, "i_a": -1.0})
    outcome = site.take(text)
    assert counts(outcome) == (4, 2, 1, 0, 1)
    assert stands(site) == [["00:00", 462.0, None], ["00:15", 460.0, 1.0]]
    assert site.query("select count(*) from file") == [[1]]
    assert site.query("select line, \"column\" from reject order by line") == [
        [2, "i_a"], [3, "i_a"], [5, None],
    ]  # fmt: skip
    assert site.query(HISTORY) == [["00:00", 460.0, None, 3]]


def test_corrected_map_in_between_a_b_a(site: SmallSite) -> None:
    """A, then B over it, then A corrected: A's new values are the later ones now."""
    site.take(A, "a.csv")
    site.take(B, "b.csv")
    site.write(interval_min=15, scale={"v_a": 2.0})
    # 00:00 changes what B gave; 00:15 fills B's hole; 00:30 nobody else has.
    assert counts(site.take(A, "a.csv")) == (3, 2, 1, 0, 0)
    assert stands(site) == [
        ["00:00", 460.0, 10.0],
        ["00:15", 460.0, 20.0],
        ["00:30", 460.0, 10.0],
        ["00:45", 240.0, 20.0],
    ]
    assert site.query(HISTORY) == [["00:00", 240.0, 20.0, 2]]


def test_corrected_map_in_between_b_a_a(site: SmallSite) -> None:
    """B, then A over it, then A corrected: B stands again before A is read anew."""
    site.take(B, "b.csv")
    site.take(A, "a.csv")
    site.write(interval_min=15, scale={"v_a": 2.0})
    assert counts(site.take(A, "a.csv")) == (3, 2, 1, 0, 0)
    assert stands(site) == [
        ["00:00", 460.0, 10.0],
        ["00:15", 460.0, 20.0],
        ["00:30", 460.0, 10.0],
        ["00:45", 240.0, 20.0],
    ]
    assert site.query(HISTORY) == [["00:00", 240.0, 20.0, 2]]


MOVED = {"timestamp_format": "%Y-%d-%mT%H:%M", "interval_min": 15}


@pytest.mark.parametrize("order", ["ab", "ba"])
def test_corrected_map_that_moves_the_file_away(site: SmallSite, order: str) -> None:
    """Day and month had been taken for each other: only B's own values stay in October."""
    for name in order:
        site.take({"a": A, "b": B}[name], f"{name}.csv")
    site.write(**MOVED)
    assert counts(site.take(A, "a.csv")) == (3, 3, 0, 0, 0)
    rows = site.stored("start_utc", "v_a", "i_a")
    assert [[start[5:16].replace("T", " "), v, i] for start, v, i in rows] == [
        ["01-10 00:00", 230.0, 10.0],
        ["01-10 00:15", 230.0, None],
        ["01-10 00:30", 230.0, 10.0],
        ["10-01 00:00", 240.0, 20.0],
        ["10-01 00:15", None, 20.0],
        ["10-01 00:45", 240.0, 20.0],
    ]
    assert site.query(HISTORY) == []


@pytest.mark.parametrize("order", ["ab", "ba"])
def test_moving_a_file_away_leaves_what_another_said_too(site: SmallSite, order: str) -> None:
    """Rows of B that were duplicates of A's are B's readings all the same."""
    same = export(("00:00", 230, 10), ("00:15", 230, ""), ("00:45", 230, 10))
    for name in order:
        site.take({"a": A, "b": same}[name], f"{name}.csv")
    site.write(**MOVED)
    assert counts(site.take(A, "a.csv")) == (3, 3, 0, 0, 0)
    rows = site.stored("start_utc", "v_a")
    assert [[start[5:16].replace("T", " "), v] for start, v in rows[3:]] == [
        ["10-01 00:00", 230.0],
        ["10-01 00:15", 230.0],
        ["10-01 00:45", 230.0],
    ]


def test_middle_one_of_three_is_corrected(site: SmallSite) -> None:
    """A, B, C, then B corrected: C's filling stays, A's voltage was under B's."""
    site.take(export(("00:00", 230, 10)), "a.csv")
    site.take(export(("00:00", 240, "")), "b.csv")
    site.take(export(("00:00", "", 30)), "c.csv")
    assert stands(site) == [["00:00", 240.0, 30.0]]
    site.write(**MOVED)
    site.take(export(("00:00", 240, "")), "b.csv")
    assert site.stored("v_a", "i_a") == [[240.0, None], [230.0, 30.0]]


def test_readings_restored_in_another_year_keep_their_local_time(tmp_path: Path) -> None:
    """The wrong map had put A onto B's summer six years before the right one."""
    site = SmallSite(tmp_path).write(
        clock="local", timestamp_format="%d/%m/%y %H:%M", interval_min=15
    )
    head = "Time,Va,Vb,Vc,Ia,Ib,Ic\n"
    b = head + "06/07/20 00:00,240,231,232,20,11,12\n"
    a = head + "06/07/20 00:00,230,231,232,10,11,12\n"
    site.take(b, "b.csv")
    site.take(a, "a.csv")
    site.write(clock="local", timestamp_format="%y/%m/%d %H:%M", interval_min=15)
    site.take(a, "a.csv")
    rows = site.stored("start_local", "v_a")
    assert [[local[:16], v] for local, v in rows] == [
        ["2006-07-20T00:00", 230.0],
        ["2020-07-06T00:00", 240.0],
    ]
