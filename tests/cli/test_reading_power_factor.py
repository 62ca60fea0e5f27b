"""Small exports written by hand: every power factor convention, percent, and what is clamped.

All cases: 230 V and 10 A on phase a, 2.3 kVA; a power factor of 0.8 makes 1.84 kW and
1.38 kvar (the 3-4-5 triangle).
"""

from __future__ import annotations

from pathlib import Path

import pytest
from small_site import HEADER, VALUES, SmallSite, counts, refused

STAMPS = ("2026-10-01T00:00", "2026-10-01T00:15")
PF = {"pf_a": "PFa", "pf_b": "PFb", "pf_c": "PFc"}
LEAD_LAG = {"lead_lag_a": "La", "lead_lag_b": "Lb", "lead_lag_c": "Lc"}
POWER = {"p_a_kw": "Pa", "p_b_kw": "Pb", "p_c_kw": "Pc"}
REACTIVE = {"q_a_kvar": "Qa", "q_b_kvar": "Qb", "q_c_kvar": "Qc"}
APPARENT = {"s_a_kva": "Sa", "s_b_kva": "Sb", "s_c_kva": "Sc"}


def export(columns: dict[str, str], *cells: str) -> str:
    """Two equal rows: voltages, currents, and each further cell for all three phases."""
    names = [*VALUES.values(), *columns.values()]
    values = ["230"] * 3 + ["10"] * 3 + [cell for cell in cells for _ in "abc"]
    head = ",".join(["Time", *names]) + "\n"
    return head + "".join(",".join([stamp, *values]) + "\n" for stamp in STAMPS)


LAG, LEAD = 1.38, -1.38
CASES: tuple[tuple[object, ...], ...] = (
    # unsigned: the map's assumption
    ("unsigned", {"assume": "lagging"}, PF, ("0.8",), (1.84, LAG)),
    ("unsigned", {"assume": "leading"}, PF, ("0.8",), (1.84, LEAD)),
    ("unsigned", {"assume": "lagging", "pf_unit": "percent"}, PF, ("80",), (1.84, LAG)),
    # the sign of P; lead or lag from words, from a kvar column, or assumed
    ("sign-is-power-flow", {"assume": "lagging"}, PF, ("0.8",), (1.84, LAG)),
    ("sign-is-power-flow", {}, PF | LEAD_LAG, ("0.8", "lead"), (1.84, LEAD)),
    ("sign-is-power-flow", {}, PF | LEAD_LAG, ("-0.8", "lag"), (-1.84, LEAD)),
    ("sign-is-power-flow", {}, PF | LEAD_LAG, ("-0.8", "Cap."), (-1.84, LAG)),
    ("sign-is-power-flow", {}, PF | REACTIVE, ("-0.8", "1.38"), (-1.84, LAG)),
    # the sign of lead or lag, both customs
    ("sign-is-lead-lag", {"lagging_sign": "negative"}, PF, ("-0.8",), (1.84, LAG)),
    ("sign-is-lead-lag", {"lagging_sign": "negative"}, PF, ("0.8",), (1.84, LEAD)),
    ("sign-is-lead-lag", {"lagging_sign": "positive"}, PF, ("0.8",), (1.84, LAG)),
    ("sign-is-lead-lag", {"lagging_sign": "positive"}, PF, ("-0.8",), (1.84, LEAD)),
    ("sign-is-lead-lag", {"lagging_sign": "negative", "pf_unit": "percent"}, PF, ("-80",),
     (1.84, LAG)),
    # a power column says that it is export: leading export is quadrant II
    ("sign-is-lead-lag", {"lagging_sign": "negative"}, PF | POWER, ("0.8", "-1.84"),
     (-1.84, LAG)),
    # kW with kvar, kW with kVA
    ("from-power", {}, POWER | REACTIVE, ("1.84", "1.38"), (1.84, LAG)),
    ("from-power", {}, POWER | REACTIVE, ("1.84", "-1.38"), (1.84, LEAD)),
    ("from-power", {}, POWER | REACTIVE, ("-1.84", "-1.38"), (-1.84, LEAD)),
    ("from-power", {"assume": "lagging"}, POWER | APPARENT, ("1.84", "2.3"), (1.84, LAG)),
    ("none", {}, {}, (), (None, None)),
)  # fmt: skip


@pytest.mark.parametrize(("convention", "keys", "columns", "cells", "wanted"), CASES)
def test_conventions(
    tmp_path: Path,
    convention: str,
    keys: dict[str, object],
    columns: dict[str, str],
    cells: tuple[str, ...],
    wanted: tuple[float | None, float | None],
) -> None:
    """P and Q of each phase, and of the three together."""
    site = SmallSite(tmp_path).write(VALUES | columns, pf_convention=convention, **keys)
    outcome = site.take(export(columns, *cells))
    assert counts(outcome) == (2, 2, 0, 0, 0)
    assert outcome["values_rejected"] == 0
    rows = site.query(
        "select p_a_kw, q_a_kvar, p_c_kw, q_c_kvar, p_kw, q_kvar "
        "from interval_power order by start_utc"
    )
    p, q = wanted
    if p is None or q is None:
        assert rows == [[None] * 6] * 2
    else:
        assert rows == [pytest.approx([p, q, p, q, 3 * p, 3 * q], rel=1e-12)] * 2


def test_words_for_lagging_and_leading(tmp_path: Path) -> None:
    """However they are written."""
    lagging = ["lag", "LAG", "Lagging", "ind", "ind.", "inductive", " lag "]
    leading = ["lead", "Leading", "cap", "Cap.", "capacitive"]
    site = SmallSite(tmp_path).write(VALUES | PF | LEAD_LAG, pf_convention="sign-is-power-flow")
    head, row, _ = export(PF | LEAD_LAG, "0.8", "WORD").splitlines()
    rows = [
        row.replace("T00:00", f"T{n:02d}:00").replace("WORD", word)
        for n, word in enumerate(lagging + leading)
    ]
    assert counts(site.take("\n".join([head, *rows]))) == (12, 12, 0, 0, 0)
    found = site.query("select q_a_kvar from interval_power order by start_utc")
    assert [row[0] for row in found] == pytest.approx([LAG] * 7 + [LEAD] * 5)


def test_word_that_is_neither(tmp_path: Path) -> None:
    """It is rejected by itself; Q is open then."""
    site = SmallSite(tmp_path).write(VALUES | PF | LEAD_LAG, pf_convention="sign-is-power-flow")
    outcome = site.take(export(PF | LEAD_LAG, "0.8", "sideways"))
    assert counts(outcome) == (2, 2, 0, 0, 0)
    assert outcome["values_rejected"] == 6
    assert {r["column"] for r in outcome["rejects"]} == set(LEAD_LAG)
    assert (
        site.query("select p_a_kw, q_a_kvar from interval_power")
        == [[pytest.approx(1.84), None]] * 2
    )


@pytest.mark.parametrize(
    ("unit", "printed", "clamped", "rejected"),
    [
        ("fraction", "1.000", 0, 0),
        ("fraction", "1.004", 6, 0),
        ("fraction", "-1.004", 6, 0),
        ("fraction", "1.006", 0, 6),
        ("fraction", "80", 0, 6),
        ("percent", "100.4", 6, 0),
        ("percent", "100.6", 0, 6),
    ],
)
def test_power_factor_above_one(
    tmp_path: Path, unit: str, printed: str, clamped: int, rejected: int
) -> None:
    """By half a percent it is clamped and counted, beyond that it is no value."""
    site = SmallSite(tmp_path).write(
        VALUES | PF, pf_convention="sign-is-lead-lag", lagging_sign="negative", pf_unit=unit
    )
    outcome = site.take(export(PF, printed))
    assert counts(outcome) == (2, 2, 0, 0, 0)
    assert (outcome["values_clamped"], outcome["values_rejected"]) == (clamped, rejected)
    wanted = [None] if rejected else [pytest.approx(2.3)]
    assert site.query("select p_a_kw from interval_power") == [wanted] * 2


def test_percent_is_kept_as_printed(tmp_path: Path) -> None:
    """The exported column stays as the meter printed it; `pf_a` is the fraction."""
    site = SmallSite(tmp_path).write(
        VALUES | PF, pf_convention="unsigned", assume="lagging", pf_unit="percent"
    )
    site.take(export(PF, "80"))
    rows = site.query(
        "select pf_exported_a, pf_a from interval join interval_power using (service, start_utc)"
    )
    assert rows == [[80.0, pytest.approx(0.8)]] * 2


def test_bound_of_percent_is_exact(tmp_path: Path) -> None:
    """100.5 % is on the bound and clamped; most values above it call for a word."""
    site = SmallSite(tmp_path).write(pf_a="Fa", pf_convention="unsigned", assume="lagging")
    header = HEADER.strip() + ",Fa\n"
    rows = [f"2026-10-01T00:{m:02d},230,231,232,10,11,12,100.5\n" for m in (0, 15, 30, 45)]
    outcome = site.take(header + "".join(rows))
    assert outcome["values_rejected"] == 4
    note = site.run("ingest", "--json").document["notes"][0]["reason"]
    assert "in the store already" in note
    site.write(pf_a="Fa", pf_convention="unsigned", assume="lagging", pf_unit="percent")
    (outcome,) = site.ingest()
    assert (outcome["values_rejected"], outcome["values_clamped"]) == (0, 4)


def test_date_without_time_is_an_error(tmp_path: Path) -> None:
    site = SmallSite(tmp_path).write(timestamp="Day", timestamp_format="%Y-%m-%d")
    rows = [f"2026-10-0{1 + k // 8},{k % 8}:00,230,231,232,10,11,12\n" for k in range(24)]
    ran = site.run("ingest", site.export("Day,Time,Va,Vb,Vc,Ia,Ib,Ic\n" + "".join(rows)))
    refused(ran, "same time as the row before", "name both in timestamp")
