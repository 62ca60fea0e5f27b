"""The command line against the plain reference, from the export's text to the review.

Every count and line must be equal, every derived column within 1e-6, every review figure
within 1e-9 (1e-6 where it comes from a column kept in single precision).
"""

from __future__ import annotations

import json
import math
import subprocess
import sys
from collections import Counter
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import awkward_export
import other_exports
import pytest
from plain_power import Values
from plain_reader import Reading, read_export
from plain_review import completeness_first_to_last, derive_all, gaps, iso_local, review
from planted_load import Export

CHECKOUT = Path(__file__).resolve().parents[2]
VIEWS = ("interval", "interval_power", "interval_impedance", "interval_balance")
COUNTS = ("rows_read", "rows_stored", "rows_replaced", "rows_duplicate", "rows_rejected")
SINGLE_PRECISION = ("vuf_p95", "lvur_p95", "current_unbalance_p95", "neutral_current_max_a")
ANGLES_OPEN = ("i_n_a", "iuf2", "iuf0", "s_effective_kva", "pf_effective",
               "r_delta_ohm", "x_delta_ohm")  # fmt: skip


@dataclass
class Told:
    """A site, what the reference makes of it and what the program printed."""

    export: Export
    reading: Reading
    derived: dict[datetime, Values]
    ingest: dict[str, Any]
    columns: dict[datetime, dict[str, Any]]
    review: dict[str, Any]
    check: dict[str, Any]


def refuse_constant(text: str) -> float:
    """NaN and Infinity are no JSON."""
    raise AssertionError(f"{text} in the JSON")


def command(site: Path, name: str, *arguments: str) -> dict[str, Any]:
    """Run one command as a person would and read its JSON."""
    run = subprocess.run(
        [sys.executable, "-m", "meterlens", name, "--site", str(site), "--json", *arguments],
        cwd=CHECKOUT,
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
        timeout=300,
    )
    assert run.returncode == 0, run.stderr
    document: dict[str, Any] = json.loads(run.stdout, parse_constant=refuse_constant)
    return document


def naive_utc(text: str) -> datetime:
    """An instant as the query prints it: with an offset, or plain UTC."""
    instant = datetime.fromisoformat(text)
    return instant if instant.tzinfo is None else instant.astimezone(UTC).replace(tzinfo=None)


def interval_columns(site: Path) -> dict[datetime, dict[str, Any]]:
    """All columns of the interval views, by UTC start."""
    found: dict[datetime, dict[str, Any]] = {}
    for view in VIEWS:
        answer = command(site, "query", f"select * from {view} order by service, start_utc")
        for cells in answer["rows"]:
            row = dict(zip(answer["columns"], cells, strict=True))
            assert row["service"] == "main"
            found.setdefault(naive_utc(row["start_utc"]), {}).update(row)
        assert len(answer["rows"]) == len(found), view
    return found


def reference(export: Export) -> tuple[Reading, dict[datetime, Values]]:
    """The plain reading of an export, and its derived columns."""
    reading = read_export(export.file.read_bytes(), export.export_map)
    return reading, derive_all(reading.intervals, export.export_map, export.service)


@pytest.fixture(scope="module", params=sorted(other_exports.BUILDERS))
def told(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Told:
    """Each export, ingested, queried, reviewed and checked once."""
    site = tmp_path_factory.mktemp(request.param)
    export = other_exports.BUILDERS[request.param](site)
    reading, derived = reference(export)
    return Told(
        export,
        reading,
        derived,
        command(site, "ingest"),
        interval_columns(site),
        command(site, "review"),
        command(site, "check"),
    )


def file_of(document: dict[str, Any], export: Export) -> dict[str, Any]:
    """The one file of an ingest."""
    (found,) = document["files"]
    assert Path(found["file"]).name == export.file.name
    assert found["service"] == "main"
    entry: dict[str, Any] = found
    return entry


def close(mine: float | None, theirs: Any, rel: float, absolute: float = 1e-9) -> bool:
    """Equal within a tolerance; None only to None."""
    if mine is None or theirs is None:
        return mine is None and theirs is None
    return math.isclose(mine, float(theirs), rel_tol=rel, abs_tol=absolute)


def test_counts(told: Told) -> None:
    """Every row has the outcome that the definitions give it."""
    found = file_of(told.ingest, told.export)
    assert {k: found[k] for k in COUNTS} == {k: getattr(told.reading, k) for k in COUNTS}
    assert found["values_rejected"] == len(told.reading.value_rejects)


def test_reject_lines(told: Told) -> None:
    """Every reject stands with its physical line; a value reject names its column too."""
    found = file_of(told.ingest, told.export)["rejects"]
    lines = told.reading.row_rejects + [line for line, _ in told.reading.value_rejects]
    assert Counter(x["line"] for x in found) == Counter(lines)
    headers = {key: header for key, header, _ in told.export.export_map.columns}
    by_line = {x["line"]: x for x in found}
    for line, key in told.reading.value_rejects:
        assert by_line[line]["column"] in (key, headers[key])
    texts = dict(enumerate(told.export.file.read_bytes().splitlines(), start=1))
    for x in found:
        assert x["reason"]
        whole = texts[x["line"]].decode(told.export.export_map.encoding)
        assert x["text"] in whole or whole in x["text"]


def test_interval_starts(told: Told) -> None:
    """The same instants are stored, the repeated hour twice, in UTC and on the site clock."""
    assert sorted(told.columns) == sorted(told.derived)
    zone = told.export.export_map.zone
    for start, row in told.columns.items():
        shown = datetime.fromisoformat(row["start_local"]).replace(tzinfo=None)
        assert shown.isoformat(timespec="seconds") == iso_local(start, zone)[:19]
        assert row["interval_min"] == told.export.export_map.interval_min


def test_derived_columns(told: Told) -> None:
    """Every derived column of every interval, to 1e-6 of the phasor reference."""
    wrong: list[str] = []
    for start, mine in told.derived.items():
        for name, value in mine.items():
            if start in told.export.loose and name in ANGLES_OPEN:
                continue
            theirs = told.columns[start][name]
            if not close(value, theirs, 1e-6, 1e-7):
                wrong.append(f"{start} {name}: reference {value}, program {theirs}")
    assert not wrong, f"{len(wrong)} values differ, first:\n" + "\n".join(wrong[:20])


def test_grades(told: Told) -> None:
    """L-N magnitudes only: nominal voltage angles, and a PF for each phase."""
    assert {x["angle_grade"] for x in told.columns.values()} == {"nominal"}
    grades = {x["current_angle_grade"] for x in told.columns.values()}
    assert "per-phase" in grades


def test_review_figures(told: Told) -> None:
    """Every figure of every month."""
    zone, service = told.export.export_map.zone, told.export.service
    mine = review(told.derived, zone, told.export.export_map.interval_min, service)
    assert [x["month"] for x in told.review["months"]] == sorted(mine)
    wrong: list[str] = []
    for month in told.review["months"]:
        (theirs,) = month["services"]
        assert theirs["service"] == "main"
        for name, value in mine[month["month"]].items():
            if isinstance(value, str):
                same = value == theirs[name]
            else:
                same = close(value, theirs[name], 1e-6 if name in SINGLE_PRECISION else 1e-9)
            if not same:
                wrong.append(f"{month['month']} {name}: {value} against {theirs[name]}")
    assert not wrong, "\n".join(wrong)


def test_check_figures(told: Told) -> None:
    """First and last interval, completeness and every gap."""
    (found,) = told.check["services"]
    zone, starts = told.export.export_map.zone, sorted(told.derived)
    length = told.export.export_map.interval_min
    assert found["service"] == "main"
    assert found["first"] == iso_local(starts[0], zone)
    # the record's last instant may be told as its last start or as that interval's end
    end = iso_local(starts[-1] + (starts[1] - starts[0]), zone)
    assert found["last"] in (iso_local(starts[-1], zone), end)
    assert found["interval_min"] == length
    assert close(completeness_first_to_last(told.derived, length), found["completeness"], 1e-9)
    mine = [(iso_local(a, zone), iso_local(b, zone), n) for a, b, n in gaps(starts, length)]
    assert [(x["start"], x["end"], x["missing_intervals"]) for x in found["gaps"]] == mine


def reject_count(site: Path) -> int:
    """Rows of the `reject` view."""
    answer = command(site, "query", "select count(*) as rejects from reject")
    count: int = answer["rows"][0][0]
    return count


def test_second_ingest_stores_nothing(tmp_path: Path) -> None:
    """A file known by its content and map: good rows are duplicates, rejects stand once."""
    export = awkward_export.build(tmp_path)
    reading, _ = reference(export)
    command(tmp_path, "ingest")
    before, rejects = interval_columns(tmp_path), reject_count(tmp_path)
    assert rejects == reading.rows_rejected + len(reading.value_rejects)
    found = file_of(command(tmp_path, "ingest"), export)
    assert found["rows_stored"] == found["rows_replaced"] == 0
    assert found["rows_duplicate"] == reading.rows_read - reading.rows_rejected
    assert found["rows_rejected"] == reading.rows_rejected
    assert reject_count(tmp_path) == rejects
    assert interval_columns(tmp_path) == before


@pytest.mark.parametrize(
    "wrong",
    [
        replace(awkward_export.MAP, lagging_sign="positive"),
        replace(awkward_export.MAP, stamp="start"),
        replace(awkward_export.MAP, clock="utc"),
    ],
    ids=["lagging-sign", "stamp", "clock"],
)
def test_corrected_map_replaces_the_earlier_ingest(wrong: Any, tmp_path: Path) -> None:
    """The same file under a better map leaves nothing of the first reading behind."""
    first = awkward_export.build(tmp_path, wrong)
    command(tmp_path, "ingest")
    assert sorted(interval_columns(tmp_path)) == sorted(reference(first)[1])
    export = awkward_export.build(tmp_path)
    reading, derived = reference(export)
    found = file_of(command(tmp_path, "ingest"), export)
    assert {k: found[k] for k in COUNTS} == {k: getattr(reading, k) for k in COUNTS}
    assert found["values_rejected"] == len(reading.value_rejects)
    assert reject_count(tmp_path) == reading.rows_rejected + len(reading.value_rejects)
    columns = interval_columns(tmp_path)
    assert sorted(columns) == sorted(derived)
    for start, mine in derived.items():
        assert close(mine["q_kvar"], columns[start]["q_kvar"], 1e-9)
        assert close(mine["i_a"], columns[start]["i_a"], 1e-12)


def test_lone_stamp_in_the_repeated_hour_is_rejected(tmp_path: Path) -> None:
    """Where continuity cannot tell which hour it was, the row is rejected."""
    export = other_exports.lone_repeated_stamp(tmp_path)
    reading, derived = reference(export)
    found = file_of(command(tmp_path, "ingest"), export)
    assert [x["line"] for x in found["rejects"]] == reading.row_rejects
    assert len(reading.row_rejects) == 1
    assert sorted(interval_columns(tmp_path)) == sorted(derived)


def test_assumed_sign_leaves_q_open_at_export(tmp_path: Path) -> None:
    """`assume` fixes Q at import only: at export P is known and Q is not."""
    export = other_exports.assumed_sign(tmp_path)
    _, derived = reference(export)
    command(tmp_path, "ingest")
    columns = interval_columns(tmp_path)
    exported = [start for start, planted in export.truth.items() if planted.exporting]
    assert len(exported) == 4
    names = ("p_kw", "q_kvar", "s_vector_kva", "s_arithmetic_kva", "pf_vector", "pf_arithmetic")
    for start, mine in derived.items():
        for name in names:
            assert close(mine[name], columns[start][name], 1e-6), (start, name)
        assert (columns[start]["q_kvar"] is None) == (start in exported)
