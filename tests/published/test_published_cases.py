"""Every folder beside this file is a published case; README.md says how to add one."""

from __future__ import annotations

import math
import tomllib
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest
from reference_kinds import PROGRAM, RECOMPUTED

HERE = Path(__file__).parent
CASES = {
    path.parent.name: tomllib.loads(path.read_text(encoding="utf-8"))
    for path in sorted(HERE.glob("*/case.toml"))
}
STATUSES = {"SEEN-P", "SEEN-S", "SEEN-TB", "MEM", "CALC"}
Case = dict[str, Any]

every_case = pytest.mark.parametrize("case", CASES.values(), ids=CASES.keys())


def difference(value: float, printed: float, quantity: str) -> float:
    apart = abs(value - printed)
    # Angles are printed in either half turn.
    return min(apart % 360.0, -apart % 360.0) if quantity.endswith("_deg") else apart


def reads_as(value: float, row: Case) -> bool:
    """Whether a value rounds to the digits as printed."""
    exponent = Decimal(row["value"]).as_tuple().exponent
    assert isinstance(exponent, int)
    half = 0.5 * 10.0**exponent
    return difference(value, float(row["value"]), row["quantity"]) <= half * (1.0 + 1e-9)


def test_there_are_cases() -> None:
    folders = {p.name for p in HERE.iterdir() if p.is_dir() and not p.name.startswith("__")}
    assert folders == set(CASES)
    assert set(PROGRAM) == set(RECOMPUTED) == {case["kind"] for case in CASES.values()}


@every_case
def test_case_says_where_it_is_from(case: Case) -> None:
    assert set(case) <= {"title", "kind", "source", "status", "note", "inputs", "printed"}
    assert case["title"]
    assert case["source"]
    assert case["printed"]
    statuses = {case["status"], *(row.get("status", "CALC") for row in case["printed"])}
    assert statuses <= STATUSES
    if "MEM" in statuses:
        assert "value from memory" in case["note"]
    for row in case["printed"]:
        assert set(row) <= {"quantity", "value", "status", "wrong"}
        assert isinstance(row["value"], str), "write the digits as text, as printed"


@every_case
def test_program_agrees_with_another_route(case: Case) -> None:
    ours = PROGRAM[case["kind"]](case["inputs"])
    theirs = RECOMPUTED[case["kind"]](case["inputs"])
    scale = max(abs(x) for name, x in theirs.items() if not name.endswith("_deg"))
    for name, value in ours.items():
        measured = {"pf_vector": "s_vector_va"}.get(name, name.removesuffix("_deg"))
        if math.isnan(theirs[name]) or theirs.get(measured, scale) <= 1e-9 * scale:
            continue  # the angle of nothing, the power factor of no power
        floor = 1.0 if name.startswith("pf") else scale
        assert difference(value, theirs[name], name) <= 1e-9 * floor, name


@every_case
def test_digits_are_as_printed(case: Case) -> None:
    ours = PROGRAM[case["kind"]](case["inputs"])
    theirs = RECOMPUTED[case["kind"]](case["inputs"])
    for row in case["printed"]:
        name, wrong = row["quantity"], row.get("wrong", False)
        assert reads_as(theirs[name], row) is not wrong, f"{name} recomputed: {theirs[name]}"
        if name in ours:
            assert reads_as(ours[name], row) is not wrong, f"{name}: {ours[name]}"


LINE_CASES = {name: case for name, case in CASES.items() if case["kind"] == "line-voltages"}


@pytest.mark.parametrize("case", LINE_CASES.values(), ids=LINE_CASES.keys())
def test_the_handbook_approximation_is_near(case: Case) -> None:
    exact = PROGRAM["line-voltages"](case["inputs"])["vuf_percent"]
    near = RECOMPUTED["line-voltages"](case["inputs"])["approximation_82_percent"]
    assert abs(near - exact) <= 0.01 * exact
