"""Numbers, sizes and tables in words: nothing rounded into a falsehood."""

from __future__ import annotations

import math
import re
import sys
from dataclasses import replace
from pathlib import Path

import pytest

from meterlens.report.facts import ServiceFacts, ServicePage
from meterlens.report.figures_load import load, power_factor
from meterlens.report.figures_plane import plane
from meterlens.report.findings_table import count_words, findings_table
from meterlens.report.months_tables import months_tables
from meterlens.report.pages import write_pages
from meterlens.report.record import lay_out
from meterlens.report.summaries import readouts_of
from meterlens.report.words import (
    ASSUMED_SENSE,
    local_ms,
    number,
    percent,
    quantity,
    sense_words,
    share,
    size_words,
    small_percent,
    when,
)

sys.path.insert(0, str(Path(__file__).parents[1] / "browser"))
from report_samples import quarters_page

TIE = "\u00a0"


def test_numbers_and_times_as_people_read_them() -> None:
    assert number(182340.4, 0) == "182,340"
    assert number(-0.0001, 2) == "0.00"
    assert number(-12.345) == "−12.3"
    assert number(float("nan")) == "–"
    assert percent(0.8352, 0) == "84%"
    assert quantity(167011.2, "kWh", 0) == f"167,011{TIE}kWh"
    assert quantity(None, "kWh", 0) == "–"
    assert when("2026-10-25T01:30:00+01:00") == "2026-10-25 01:30"
    assert local_ms("1970-01-02T00:00:00+05:00") == 86_400_000


@pytest.mark.parametrize(
    ("value", "words"),
    [
        (1.0, "100%"),
        (0.9997, "99.97%"),
        (0.99996, "99.99%"),
        (0.999999, "99.99%"),
        (0.99372, "99.37%"),
        (0.0, "0.00%"),
        (None, "–"),
    ],
)
def test_only_what_is_complete_says_so(value: float | None, words: str) -> None:
    assert share(value) == words


def test_tiny_share_is_not_nothing() -> None:
    assert small_percent(0.0) == "0.0%"
    assert small_percent(0.00004) == "less than 0.1%"
    assert small_percent(0.0123) == "1.2%"


@pytest.mark.parametrize(
    ("kind", "value", "unit", "words"),
    [
        ("voltage-imbalance", 0.025288, "fraction", "2.53%"),
        ("current-imbalance", 0.13873, "fraction", "13.9%"),
        ("overload", 1.166892, "fraction", "116.7%"),
        ("near-rating", 0.879, "fraction", "87.9%"),
        ("incomplete-month", 0.0010, "fraction", "0.10%"),
        ("low-pf", 0.74059, "fraction", "0.741"),
        ("leading", 0.7, "fraction", "0.700"),
        ("voltage", 0.870572, "pu", f"0.871{TIE}pu"),
        ("rejected", 3.0, "rows", f"3{TIE}rows"),
        ("rejected", 1.0, "rows", f"1{TIE}row"),
        ("gap", 43104.0, "intervals", f"43,104{TIE}intervals"),
        ("gap", None, "intervals", "–"),
    ],
)
def test_sizes_are_written_as_in_the_sentences(
    kind: str, value: float | None, unit: str, words: str
) -> None:
    assert size_words(kind, value, unit) == words


def test_assumed_sense_is_never_a_measurement() -> None:
    assert sense_words(0.0, assumed=False) == f"0.0{TIE}h"
    assert sense_words(0.0, assumed=True) == "not measured"
    assert sense_words(12.0, assumed=True) == f"12.0{TIE}h, by assumption"


def test_assumed_sense_is_said_beside_charts_and_figures(tmp_path: Path) -> None:
    page = quarters_page()
    months = [m | {"leading_hours": 0.0, "reactive_leading_kvarh": 0.0} for m in page.months]
    assumed = replace(page, service=replace(page.service, sense_assumed=True), months=months)
    record = lay_out(assumed.service, assumed.frame)
    for figure in (load(record, []), power_factor(record), plane(record, assumed.frame)):
        assert ASSUMED_SENSE in figure.caption, figure.key
    record = lay_out(page.service, page.frame)
    for figure in (load(record, []), power_factor(record), plane(record, page.frame)):
        assert ASSUMED_SENSE not in figure.caption, figure.key
    write_pages("S", "EUR", [assumed], tmp_path, version="9")
    for name in ("index.html", "main.html"):
        text = (tmp_path / name).read_text(encoding="utf-8")
        assert "leading not measured" in text
        assert not re.search(r"leading 0|0\.0.h leading", text)


def test_readouts_say_the_worst_of_the_record_beside_the_newest_month() -> None:
    page = quarters_page()
    older, newer = page.months
    mild = newer | {"low_pf_hours": 0.0, "peak_demand_kw": 297.3}
    remarks = {r[0]: r[2] for r in readouts_of(replace(page, months=[older, mild]))}
    assert f"whole record 214.2{TIE}h" in remarks["Low power factor"]
    assert f"whole record 301.6{TIE}kW" in remarks["Peak demand"]
    assert "lowest month 0.874" in remarks["Power factor"]
    alone = readouts_of(replace(page, months=[mild]))
    assert not [r for _, _, lines in alone for r in lines if "record" in r and "recorded" not in r]


def test_unknown_values_are_dashes_and_no_cost_no_column() -> None:
    service = quarters_page().service
    for table in months_tables([{"month": "2026-10", "energy_kwh": None}], service, "EUR"):
        assert set(table.rows[0][1:]) == {"–"}
        assert "Cost, EUR" not in [c.heading for c in table.columns]


def _finding(kind: str, severity: str, start: str, end: str, **more: object) -> dict[str, object]:
    base: dict[str, object] = {"kind": kind, "severity": severity, "start": start, "end": end}
    base |= {"unit": "fraction", "magnitude": 0.1, "text": kind, "next_step": "See."}
    return base | {"confidence": "high"} | more


def _mixed_page() -> ServicePage:
    october, november = (f"2026-{m}-01T00:00:00+00:00" for m in (10, 11))
    december = "2026-12-01T00:00:00+00:00"
    short = _finding("incomplete-month", "note", october, november)
    dip = _finding("voltage", "act", "2026-10-14T21:30:00", "2026-10-14T22:00:00", unit="pu")
    imbalance = _finding("current-imbalance", "look", "2026-11-03T10:00", "2026-11-03T12:00")
    lines = _finding("rejected", "look", october, december, unit="rows", magnitude=3.0)
    check = {"first": october, "last": december, "findings": [lines]}
    months = [
        {"month": "2026-10", "findings": [short, dip]},
        {"month": "2026-11", "findings": [imbalance]},
    ]
    service = ServiceFacts("x", "X", "wye-4w", "Europe/Lisbon")
    return ServicePage(
        service, quarters_page().frame, months, [], check, [short, dip, imbalance, lines]
    )


def test_findings_stand_under_their_month_the_whole_record_last() -> None:
    table = findings_table(_mixed_page(), "EUR")
    headings = [c.heading for c in table.columns]
    assert headings == [
        "Priority",
        "Finding",
        "What the readings show",
        "When",
        "Size",
        "Confidence",
        "Next step",
    ]
    assert [g.heading for g in table.groups] == ["2026-11", "2026-10", "Whole record"]
    assert [row[0] for row in table.groups[1].rows] == ["act", "note"]
    assert [row[3] for row in table.groups[1].rows] == [
        "2026-10-14 21:30 to\n2026-10-14 22:00",
        "whole month",
    ]
    assert table.groups[2].rows[0][3:5] == ("whole record", f"3{TIE}rows")


def test_whole_record_of_one_month_keeps_the_month_s_findings_with_the_month() -> None:
    page = _mixed_page()
    start, end = "2026-10-01T00:00:00", "2026-11-01T00:00:00"
    short = _finding("incomplete-month", "note", start, end)
    one = replace(
        page,
        months=[{"month": "2026-10", "findings": [short]}],
        check={"first": start, "last": end, "findings": []},
        findings=[short],
    )
    assert [g.heading for g in findings_table(one, "EUR").groups] == ["2026-10"]


def test_cost_and_range_show_where_they_exist() -> None:
    page = _mixed_page()
    costed = _finding("voltage-imbalance", "act", "2026-10-02T00:00", "2026-10-02T08:00")
    costed |= {"cost_per_month": 1171.4, "magnitude": 0.0253, "low": 0.021, "high": 0.029}
    table = findings_table(replace(page, findings=[costed]), "EUR")
    place = [c.heading for c in table.columns].index("EUR a month")
    (row,) = [r for r in table.rows if r[1] == "Voltage imbalance"]
    assert row[place - 1] == "2.53%\n2.10% to\n2.90%"
    assert row[place] == "1,171"
    assert {r[place] for r in table.rows} == {"1,171", "–"}


def test_counts_are_words() -> None:
    findings = [{"severity": s} for s in ("look", "act", "act", "note", "look", "note")]
    assert [w for _, w in count_words(findings)] == ["2 to act on", "2 to look at", "2 notes"]
    assert count_words([{"severity": "note"}]) == [("note", "1 note")]


def test_plane_of_nearly_unity_load_still_shows_the_wedge() -> None:
    page = quarters_page()
    flat = page.frame.with_columns(q_kvar=page.frame["q_kvar"] * 0.01)
    for target, one_scale in ((0.95, True), (0.99, False)):
        service = replace(page.service, target_pf=target)
        figure = plane(lay_out(service, flat), flat)
        (p_low, p_high), (q_low, q_high) = (
            figure.layout[name]["range"] for name in ("xaxis", "yaxis")
        )
        assert q_high > p_high * math.tan(math.acos(target))
        assert figure.layout["meta"]["aspect"] >= 0.3
        assert ("scaleanchor" in figure.layout["yaxis"]) is one_scale
        assert ("have the same scale" in figure.caption) is one_scale
        label = figure.layout["annotations"][-1]
        assert label["xref"] == "x domain"
        assert label["x"] == 1
        assert p_low <= 0 >= q_low
