"""The machine-readable results: keys, types, times, notes; and tables that fit a terminal."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from small_site import VALUES, SmallSite, run

LOCAL_ISO = re.compile(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d[+-]\d\d:\d\d")
NUMBER, TEXT = (int, float), (str,)
NUMBER_OR_NULL, TEXT_OR_NULL = (int, float, type(None)), (str, type(None))

FINDING = {
    "kind": TEXT, "service": TEXT, "phase": TEXT_OR_NULL, "start": TEXT_OR_NULL,
    "end": TEXT_OR_NULL, "severity": TEXT, "magnitude": NUMBER_OR_NULL, "low": NUMBER_OR_NULL,
    "high": NUMBER_OR_NULL, "unit": TEXT_OR_NULL, "cost_per_month": NUMBER_OR_NULL,
    "confidence": TEXT, "text": TEXT, "next_step": TEXT,
}  # fmt: skip
FILE = {
    "file": TEXT, "service": TEXT, "rows_read": (int,), "rows_stored": (int,),
    "rows_replaced": (int,), "rows_duplicate": (int,), "rows_rejected": (int,),
    "values_rejected": (int,), "rejects": (list,),
}  # fmt: skip
REJECT = {"line": (int,), "column": TEXT_OR_NULL, "reason": TEXT, "text": TEXT_OR_NULL}
CHECKED = {
    "service": TEXT, "first": TEXT_OR_NULL, "last": TEXT_OR_NULL, "interval_min": NUMBER_OR_NULL,
    "completeness": NUMBER_OR_NULL, "gaps": (list,), "findings": (list,),
}  # fmt: skip
GAP = {"start": TEXT, "end": TEXT, "missing_intervals": (int,)}
MONTH_NUMBERS = (
    "completeness", "energy_kwh", "energy_export_kwh", "reactive_lagging_kvarh",
    "reactive_leading_kvarh", "apparent_kvah", "pf_energy_weighted", "peak_demand_kw",
    "peak_demand_kva", "pf_at_peak", "load_factor", "peak_current_a",
    "peak_current_utilisation", "low_pf_hours", "leading_hours", "kvarh_above_target",
    "vuf_p95", "lvur_p95", "current_unbalance_p95", "neutral_current_max_a",
    "voltage_min_pu", "voltage_max_pu", "hours_outside_voltage_band",
)  # fmt: skip
REVIEWED = {
    "service": TEXT, "peak_demand_start": TEXT_OR_NULL, "peak_demand_kva_start": TEXT_OR_NULL,
    "peak_current_phase": TEXT_OR_NULL, "change_vs_previous_month": (dict,),
    "change_vs_same_month_last_year": (dict,), "cost": (dict,), "reconciliation": (list,),
    "findings": (list,),
} | dict.fromkeys(MONTH_NUMBERS, NUMBER_OR_NULL)  # fmt: skip
PERIOD = {
    "service": TEXT, "kind": TEXT, "phase": TEXT_OR_NULL, "start": TEXT, "end": TEXT,
    "hours": NUMBER, "intervals": (int,), "worst": NUMBER, "mean": NUMBER_OR_NULL, "unit": TEXT,
    "energy_kwh": NUMBER_OR_NULL, "kvarh_above_target": NUMBER_OR_NULL,
}  # fmt: skip
PF = {"pf_a": "PFa", "pf_b": "PFb", "pf_c": "PFc"}


def export(with_pf: bool) -> str:
    """Two days over Lisbon's autumn with low PF, an overload, a gap and broken rows."""
    names = ["Time", *VALUES.values(), *(PF.values() if with_pf else ())]
    lines = [",".join(names)]
    start = datetime(2026, 10, 24, 12)
    for n in range(192):
        if 40 <= n < 46:
            continue
        stamp = (start + timedelta(minutes=15 * n)).isoformat(timespec="minutes")
        amps = 130 if 100 <= n < 110 else 60
        factor = "0.70" if n < 90 else "0.98"
        lines.append(",".join([stamp, *["230"] * 3, *[str(amps)] * 3, *[factor] * 3 * with_pf]))
    lines += ["torn", lines[-1].replace("230", "-5", 1)]
    return "\n".join(lines) + "\n"


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> SmallSite:
    """A site with something of everything."""
    made = SmallSite(tmp_path_factory.mktemp("json") / "site")
    made.write(VALUES | PF, pf_convention="unsigned", assume="lagging")
    made.take(export(with_pf=True))
    return made


@pytest.fixture(scope="module")
def powerless(tmp_path_factory: pytest.TempPathFactory) -> SmallSite:
    """A site whose export has voltages and currents only."""
    made = SmallSite(tmp_path_factory.mktemp("json") / "powerless").write(pf_convention="none")
    made.take(export(with_pf=False))
    return made


def has(document: dict[str, Any], shape: Mapping[str, tuple[type, ...]]) -> None:
    """Every key is there, of its type; no truth value passes for a number."""
    for key, types in shape.items():
        assert key in document, key
        assert isinstance(document[key], types), (key, document[key])
        assert not isinstance(document[key], bool), key


def leaves(value: object, key: str = "") -> Iterator[tuple[str, object]]:
    """Every value that is no list and no object, with its key."""
    if isinstance(value, dict):
        for name, inner in value.items():
            yield from leaves(inner, name)
    elif isinstance(value, list):
        for inner in value:
            yield from leaves(inner, key)
    else:
        yield key, value


def sound(document: dict[str, Any]) -> None:
    """Times are local ISO with offset and seconds, numbers finite, notes say key and reason."""
    for key, value in leaves(document):
        if isinstance(value, float):
            assert math.isfinite(value), key
        if key in ("start", "end", "first", "last") or key.endswith("_start"):
            assert value is None or LOCAL_ISO.fullmatch(str(value)), (key, value)
    assert isinstance(document["notes"], list)
    for note in document["notes"]:
        assert {"key", "reason"} <= set(note)


def test_ingest(site: SmallSite) -> None:
    """Files with their outcomes, and the first rejects."""
    ran = site.run("ingest", "--json")
    document = ran.document
    sound(document)
    (one,) = document["files"]
    has(one, FILE)
    assert (one["rows_rejected"], one["values_rejected"]) == (1, 1)
    for reject in one["rejects"]:
        has(reject, REJECT)


def test_rejects_stop_at_a_hundred(site: SmallSite) -> None:
    """The list ends there, the count does not."""
    other = SmallSite(site.folder.parent / "torn").write()
    good = "2026-10-01T00:00,230,231,232,1,2,3\n2026-10-01T00:15,230,231,232,1,2,3\n"
    outcome = other.take("Time,Va,Vb,Vc,Ia,Ib,Ic\n" + good + "torn\n" * 150)
    assert (outcome["rows_read"], outcome["rows_rejected"]) == (152, 150)
    assert [reject["line"] for reject in outcome["rejects"]] == list(range(4, 104))


def test_check(site: SmallSite) -> None:
    """Services with extent, gaps and findings; across the clock change both offsets."""
    document = site.run("check", "--json").document
    sound(document)
    (one,) = document["services"]
    has(one, CHECKED)
    for gap in one["gaps"]:
        has(gap, GAP)
    for finding in one["findings"]:
        has(finding, FINDING)
        assert finding["severity"] in ("urgent", "act", "look", "note")
    assert one["first"] == "2026-10-24T13:00:00+01:00"
    assert one["last"] == "2026-10-26T12:00:00+00:00"
    assert [gap["missing_intervals"] for gap in one["gaps"]] == [6]


def test_review(site: SmallSite) -> None:
    """Every key of the interface, for each month and service."""
    document = site.run("review", "--json").document
    sound(document)
    assert [month["month"] for month in document["months"]] == ["2026-10"]
    for month in document["months"]:
        for one in month["services"]:
            has(one, REVIEWED)
            has(one["cost"], {"lines": (list,), "total": NUMBER_OR_NULL})
            for finding in one["findings"]:
                has(finding, FINDING)


def test_periods(site: SmallSite) -> None:
    """Kinds, spans and figures."""
    document = site.run("periods", "--json").document
    sound(document)
    assert {"low-pf", "overload"} <= {p["kind"] for p in document["periods"]}
    for period in document["periods"]:
        has(period, PERIOD)
    one = site.run("periods", "--json", "--kind", "overload").document["periods"]
    assert {p["kind"] for p in one} == {"overload"}


def test_null_has_a_note(powerless: SmallSite) -> None:
    """Without a power factor nothing of power is known, and the notes say why for each key."""
    document = powerless.run("review", "--json").document
    sound(document)
    notes = {note["key"].split(".")[-1] for note in document["notes"]}
    (one,) = document["months"][0]["services"]
    nulls = {key for key in REVIEWED if one[key] is None}
    assert {"energy_kwh", "pf_energy_weighted", "peak_demand_kw", "load_factor"} <= nulls
    assert nulls <= notes, nulls - notes
    assert one["peak_current_a"] == 130
    sound(powerless.run("check", "--json").document)
    sound(powerless.run("periods", "--json").document)


def test_record_without_readings(tmp_path: Path) -> None:
    """A service that has no readings yet is null with its reason."""
    site = SmallSite(tmp_path).write()
    file = site.folder / "site.toml"
    text = file.read_text(encoding="utf-8")
    second = text[text.index("[[service]]") :].replace('"main"', '"annex"')
    file.write_text(text + "\n" + second, encoding="utf-8")
    path = site.export(export(with_pf=False))
    site.ingest("--service", "main", path)
    document = site.run("check", "--json").document
    sound(document)
    annex = next(one for one in document["services"] if one["service"] == "annex")
    assert annex["first"] is None
    assert any(note.get("service") == "annex" for note in document["notes"])
    sound(site.run("review", "--json").document)


COMMANDS = (
    ["ingest"],
    ["check"],
    ["review"],
    ["periods"],
    ["query", "file"],
    ["query", "interval_power"],
    ["query", "select service, start_utc, v_a from interval limit 3"],
)


@pytest.mark.parametrize("command", COMMANDS, ids=" ".join)
@pytest.mark.parametrize("which", ["site", "powerless"])
def test_tables_fit_a_terminal(
    request: pytest.FixtureRequest, which: str, command: list[str]
) -> None:
    """No line is wider than 80 columns; nothing but JSON with ``--json``."""
    where: SmallSite = request.getfixturevalue(which)
    ran = where.run(*command)
    assert ran.code == 0, ran.err
    assert max(len(line) for line in ran.out.splitlines()) <= 80
    assert isinstance(where.run(*command, "--json").document, dict)


def test_site_is_found_upward(site: SmallSite) -> None:
    """From a folder below it, as with ``--site``."""
    below = site.folder / "exports" / "older"
    below.mkdir(parents=True, exist_ok=True)
    named = site.run("check", "--json")
    assert run("check", "--json", cwd=below).out == named.out
    assert run("check", "--json", cwd=site.folder).out == named.out


def test_same_question_same_answer(site: SmallSite) -> None:
    """Byte for byte."""
    for command in ("check", "review", "periods"):
        assert site.run(command, "--json").out == site.run(command, "--json").out
