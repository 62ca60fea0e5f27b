"""What a result leans on is said, and what is wrong throughout is not a footnote."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from small_site import GOOD, HEADER, SmallSite, refused

PF = {"timestamp": "Time", "v_a": "Va", "v_b": "Vb", "v_c": "Vc", "i_a": "Ia", "i_b": "Ib"}
POWER = {"timestamp": "Time", "p_kw": "kW", "q_kvar": "kvar"}


def power_rows(step: int, *pairs: tuple[float, float]) -> str:
    """Totals from midnight of 1 October on, one row a step of so many minutes."""
    lines = ["Time,kW,kvar"]
    for k, (p, q) in enumerate(pairs):
        hour, minute = divmod(k * step, 60)
        lines.append(f"2026-10-01T{hour:02d}:{minute:02d},{p},{q}")
    return "\n".join(lines) + "\n"


def reviewed(site: SmallSite) -> tuple[dict[str, Any], dict[str, str], list[dict[str, Any]]]:
    """The first month's entry, its notes by key, and its findings."""
    document = site.run("review", "--json").document
    entry = document["months"][0]["services"][0]
    notes = {note["key"]: note["reason"] for note in document["notes"]}
    return entry, notes, entry["findings"]


def test_a_window_that_is_no_multiple_gives_no_demand(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write(POWER, pf_convention="from-power")
    site.take(power_rows(10, *[(40.0, 5.0), (50.0, 5.0), (60.0, 5.0)] * 4))
    entry, notes, findings = reviewed(site)
    assert entry["peak_demand_kw"] is None
    assert entry["load_factor"] is None
    assert entry["energy_kwh"] == pytest.approx(100.0)
    assert "15-minute demand window is no multiple" in notes["peak_demand_kw"]
    assert "demand-unknown" in {finding["kind"] for finding in findings}


def test_coarser_data_report_their_demand_with_the_bound(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write(POWER, pf_convention="from-power")
    site.take(power_rows(60, (40.0, 5.0), (50.0, 5.0), (45.0, 5.0)))
    entry, notes, _ = reviewed(site)
    assert entry["peak_demand_kw"] == 50.0
    assert "between 50 and 200 kW" in notes["peak_demand_kw"]


def test_reactive_power_without_active_power_is_low_or_leading(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write(POWER, pf_convention="from-power")
    site.take(power_rows(15, *[(0.0, 30.0)] * 16, *[(0.0, -30.0)] * 16))
    entry, _, _ = reviewed(site)
    assert (entry["low_pf_hours"], entry["leading_hours"]) == (4.0, 4.0)
    kinds = [p["kind"] for p in site.run("periods", "--json").document["periods"]]
    assert kinds == ["low-pf", "leading"]


def test_voltages_and_currents_alone_have_no_energy(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write()
    site.take(GOOD)
    entry, notes, _ = reviewed(site)
    assert entry["energy_kwh"] is None
    assert "no total power" in notes["energy_kwh"]
    assert site.query("select energy_kwh, reactive_lagging_kvarh from month") == [[None, None]]


def test_power_that_disagrees_throughout_comes_first(tmp_path: Path) -> None:
    names = {"p_a_kw": "Pa", "q_a_kvar": "Qa", "p_b_kw": "Pb", "q_b_kvar": "Qb"}
    columns = PF | {"i_c": "Ic", "p_c_kw": "Pc", "q_c_kvar": "Qc", "pf_a": "Fa"} | names
    site = SmallSite(tmp_path).write(columns, pf_convention="unsigned", assume="lagging")
    header = HEADER.strip() + ",Pa,Pb,Pc,Qa,Qb,Qc,Fa\n"
    watts = ",2070,2080,2090,1000,1000,1000,0.9"  # W where kW was meant
    rows = [f"2026-10-01T00:{m:02d},230,231,232,10,11,12{watts}" for m in (0, 15, 30, 45)]
    site.take(header + "\n".join(rows) + "\n")
    _, _, findings = reviewed(site)
    assert (findings[0]["kind"], findings[0]["severity"]) == ("power-mismatch", "urgent")


def test_intervals_without_power_are_found(tmp_path: Path) -> None:
    columns = PF | {"i_c": "Ic", "pf_a": "Fa", "pf_b": "Fb", "pf_c": "Fc"}
    site = SmallSite(tmp_path).write(columns, pf_convention="unsigned", assume="lagging")
    rows = "".join(
        f"2026-10-01T00:{m:02d},230,231,232,10,{'' if m == 15 else 11},12,.9,.9,.9\n"
        for m in (0, 15, 30, 45)
    )
    site.take(HEADER.strip() + ",Fa,Fb,Fc\n" + rows)
    service = site.run("check", "--json").document["services"][0]
    assert service["completeness"] == 0.75
    (found,) = [f for f in service["findings"] if f["kind"] == "power-missing"]
    assert found["start"] == "2026-10-01T01:15:00+01:00"


def test_a_map_changed_after_reading_is_told(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write()
    site.take(GOOD)
    site.write(stamp="end")
    ran = site.run("check", "--json")
    assert "run meterlens ingest" in ran.err
    assert any(note["key"] == "columns" for note in ran.document["notes"])


def test_settings_changed_while_a_service_was_away(tmp_path: Path) -> None:
    columns = PF | {"i_c": "Ic", "pf_a": "Fa", "pf_b": "Fb", "pf_c": "Fc"}
    site = SmallSite(tmp_path)
    text = HEADER.strip() + ",Fa,Fb,Fc\n"
    text += "".join(f"2026-10-01T0{h}:00,230,231,232,10,11,12,.9,.9,.9\n" for h in range(3))
    site.write(columns, pf_convention="unsigned", assume="lagging").take(text)
    assert site.query("select sum(q_kvar) > 0 from interval_power") == [[True]]
    toml = tmp_path / "site.toml"
    toml.write_text(toml.read_text().replace('id = "main"', 'id = "other"'))
    site.take(text)
    site.write(columns, pf_convention="unsigned", assume="leading")
    rows = site.query("select sum(q_kvar) < 0 from interval_power where service = 'main'")
    assert rows == [[True]]


def test_one_bad_file_stops_no_other(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write()
    for name, text in (("1.csv", GOOD), ("2.csv", ""), ("3.csv", GOOD.replace("10-01", "10-02"))):
        site.export(text, name)
    ran = site.run("ingest", "--json")
    assert ran.code == 1
    assert "2.csv" in ran.err
    assert [file["rows_stored"] for file in ran.document["files"]] == [4, 4]


def test_a_first_ingest_that_fails_leaves_no_store(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write()
    refused(site.run("ingest", "--json", site.export("", "empty.csv")), "is empty")
    assert not (tmp_path / "store.duckdb").exists()


def test_an_answer_that_is_no_number(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write()
    site.take(GOOD)
    document = site.run("query", "--json", "select 'inf'::double, 'nan'::double, 1.5").document
    assert document["rows"] == [[None, None, "1.5"]] or document["rows"] == [[None, None, 1.5]]
    assert document["notes"][0]["reason"].startswith("2 values")
