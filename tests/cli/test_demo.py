"""The demo finds every planted thing again, and nothing else."""

from __future__ import annotations

import json
from collections import Counter
from datetime import date
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
from small_site import COUNTS, SmallSite, counts, run

PLANTED_FILE = Path(__file__).resolve().parents[2] / "demo_data" / "planted.json"
TRUTH: dict[str, Any] = json.loads(PLANTED_FILE.read_text(encoding="utf-8"))
KINDS = ("low-pf", "leading", "current-imbalance", "voltage-imbalance", "voltage", "overload")
RATING_A = {"plant": 800, "office": 315, "workshop": 250, "compressors": 200}
#: What `check` finds, from the table of the demo's README; the compressors' meter prints no sign.
FINDINGS = {
    "plant": {"gap": 20, "duplicate": 8, "rejected": 3, "power-missing": 17},
    "office": {"duplicate": 96, "impossible-value": 2, "power-missing": 2},
    "workshop": {"gap": 3, "replaced": 4, "rejected": 4},
    "compressors": {"gap": 96, "rejected": 1, "sign-assumed": 43104},
}


def planted(*kinds: str) -> list[dict[str, Any]]:
    """Planted things of these kinds."""
    return [one for one in TRUTH["planted"] if one["kind"] in kinds]


@pytest.fixture(scope="session")
def site(tmp_path_factory: pytest.TempPathFactory) -> SmallSite:
    """The folder that the demo is made in."""
    return SmallSite(tmp_path_factory.mktemp("demo") / "site")


@pytest.fixture(scope="session")
def demo(site: SmallSite) -> dict[str, Any]:
    """What ``meterlens demo DIR --json`` prints, run once."""
    ran = run("demo", site.folder, "--json")
    assert ran.code == 0, ran.err
    document: dict[str, Any] = ran.document
    return document


def test_periods_have_exact_spans(demo: dict[str, Any]) -> None:
    """Every run that the rules make of the planted causes, and no other."""
    found = sorted(
        (p["service"], p["kind"], p["start"], p["end"], p["intervals"]) for p in demo["periods"]
    )
    wanted = sorted(
        (one["service"], one["kind"], p["start"], p["end"], p["intervals"])
        for one in planted(*KINDS)
        for p in one["periods"]
    )
    assert found == wanted


def test_period_counts(demo: dict[str, Any]) -> None:
    """The number of runs of every rule in every record, the zeros among them."""
    tally = Counter(f"{p['service']}/{p['kind']}" for p in demo["periods"])
    assert {key: tally[key] for key in TRUTH["period_counts"]} == TRUTH["period_counts"]
    assert set(tally) <= set(TRUTH["period_counts"])


@pytest.mark.parametrize("one", planted(*KINDS), ids=lambda one: str(one["key"]))
def test_period_figures(demo: dict[str, Any], one: dict[str, Any]) -> None:
    """The worst figure, from phasors that the program never saw, within the meters' digits."""
    match = [
        p
        for p in demo["periods"]
        if (p["service"], p["kind"], p["start"])
        == (one["service"], one["kind"], one["periods"][0]["start"])
    ]
    assert len(match) == 1
    worst = match[0]["worst"]
    if one["unit"] == "A":
        worst *= RATING_A[one["service"]]
    assert worst == pytest.approx(one["magnitude"], rel=5e-4)
    if one["phase"] is not None:
        assert match[0]["phase"] == one["phase"]


def test_row_outcomes(demo: dict[str, Any]) -> None:
    """Counts, reject lines and rejected values of every file."""
    by_name = {Path(one["file"]).name: one for one in demo["ingest"]}
    assert set(by_name) == {Path(one["file"]).name for one in TRUTH["files"]}
    for wanted in TRUTH["files"]:
        found = by_name[Path(wanted["file"]).name]
        assert found["service"] == wanted["service"]
        assert counts(found) == counts(wanted), found["file"]
        assert sum(found[key] for key in COUNTS) == found["rows_read"]
        assert found["values_rejected"] == wanted["values_rejected"]
        assert [(r["line"], r["column"]) for r in found["rejects"]] == [
            (r["line"], r["column"]) for r in wanted["rejects"]
        ]
        texts = {r["line"]: r["text"] for r in found["rejects"]}
        assert all(texts[r["line"]] == r["text"] for r in wanted["rejects"] if "text" in r)


def test_reject_reasons(demo: dict[str, Any]) -> None:
    """Each planted reason is told apart."""
    words = {"time": "time", "fields": "fields", "no measurement": "measurement"}
    by_name = {Path(one["file"]).name: one["rejects"] for one in demo["ingest"]}
    for wanted in TRUTH["files"]:
        found = {(r["line"], r["column"]): r["reason"] for r in by_name[Path(wanted["file"]).name]}
        for reject in wanted["rejects"]:
            word = words.get(reject["reason"])
            if word is not None:
                assert word in found[reject["line"], None]


def test_gaps(demo: dict[str, Any]) -> None:
    """Planted gaps stand exactly; all other gaps are the intervals of broken rows."""
    for service in demo["check"]["services"]:
        own = [g for g in planted("gap") if g["service"] == service["service"]]
        spans = {(g["start"], g["end"]): g["rows"] for g in own}
        found = {(g["start"], g["end"]): g["missing_intervals"] for g in service["gaps"]}
        assert {span: found.get(span) for span in spans} == spans
        broken = [b for b in planted("broken-rows") if b["service"] == service["service"]]
        rest = {span: n for span, n in found.items() if span not in spans}
        assert sum(rest.values()) == sum(b["rows"] for b in broken)
        for start, end in rest:
            assert any(b["start"] <= start and end <= b["end"] for b in broken)


def test_completeness(demo: dict[str, Any]) -> None:
    """Intervals with a total power over intervals of the record, counted by hand."""
    # 61 days and the hour of the autumn change; 30 days of minutes. The plant lacks 17 rows,
    # 3 broken ones and L3's current in 17; the office's two rows have no total without their
    # rejected value.
    whole = {"plant": 5860, "office": 5860, "workshop": 5860, "compressors": 43200}
    lacking = {"plant": 17 + 3 + 17, "office": 2, "workshop": 3, "compressors": 95 + 1}
    for service in demo["check"]["services"]:
        name = service["service"]
        wanted = 1 - lacking[name] / whole[name]
        assert service["completeness"] == pytest.approx(wanted, rel=1e-12)


def test_findings_of_check(demo: dict[str, Any]) -> None:
    """Nothing turns up that was not planted."""
    found = {
        service["service"]: {f["kind"]: f["magnitude"] for f in service["findings"]}
        for service in demo["check"]["services"]
    }
    assert found == FINDINGS


def test_clock_change(demo: dict[str, Any], site: SmallSite) -> None:
    """The long day has 100 intervals, one after another in UTC."""
    del demo
    for one in planted("dst"):
        day = date.fromisoformat(one["start"][:10])
        starts = site.query(
            "select epoch(start_utc)::bigint, utc_offset_min from interval "
            f"where service = '{one['service']}' and start_local::date = '{day}' order by 1"
        )
        assert len(starts) == 100
        assert {b[0] - a[0] for a, b in pairwise(starts)} == {900}
        assert [row[1] for row in starts] == [180] * 16 + [120] * 84


def test_missing_values(demo: dict[str, Any], site: SmallSite) -> None:
    """L3's current is missing in its span and nowhere else; the total power with it."""
    del demo
    (one,) = planted("missing-values")
    rows = site.query(
        "select strftime(start_utc, '%Y-%m-%dT%H:%M:%S'), p_kw is null "
        "from interval join interval_power using (service, start_utc) "
        "where service = 'plant' and interval.i_c is null order by 1"
    )
    assert len(rows) == one["rows"]
    assert all(row[1] for row in rows)
    assert (rows[0][0], rows[-1][0]) == ("2026-11-05T16:00:00", "2026-11-05T20:00:00")


def test_replaced_rows_are_in_the_history(demo: dict[str, Any], site: SmallSite) -> None:
    """The corrected readings of the workshop, four versions and no other."""
    del demo
    (one,) = planted("replaced-rows")
    rows = site.query("select service, start_local from history order by start_local")
    assert len(rows) == one["rows"]
    assert {row[0] for row in rows} == {one["service"]}
    assert rows[0][1][:16] == one["start"][:16]
    assert rows[-1][1][:16] == "2026-10-06T14:45"


def test_pages_are_there(demo: dict[str, Any]) -> None:
    """An index and a page for each service."""
    names = {Path(page).name for page in demo["pages"]}
    assert {"index.html", *(f"{service}.html" for service in RATING_A)} <= names
    assert all(Path(page).stat().st_size > 0 for page in demo["pages"])


def test_second_ingest_stores_nothing(demo: dict[str, Any], site: SmallSite) -> None:
    """Every good row is a duplicate, the rejects are not recorded twice."""
    before = site.contents()
    again = site.ingest()
    assert len(again) == len(demo["ingest"])
    for first, second in zip(demo["ingest"], again, strict=True):
        good = first["rows_read"] - first["rows_rejected"]
        assert counts(second) == (first["rows_read"], 0, 0, good, first["rows_rejected"])
    assert site.contents() == before
