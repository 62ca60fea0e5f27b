"""Fingerprints change with what they cover, and with nothing else."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from meterlens.settings import Service, Site, derivation_digest, map_digest

COLUMNS: dict[str, Any] = {
    "timestamp": "T",
    "clock": "local",
    "stamp": "start",
    "v_a": "U",
    "pf_a": "PF",
    "pf_convention": "unsigned",
    "assume": "lagging",
}


def made(columns: dict[str, Any] | None = None, **keys: Any) -> Service:
    table = {
        "id": "main",
        "name": "Main",
        "connection": "wye-4w",
        "nominal_voltage_v": 400,
        "rating_a": 800,
        "columns": COLUMNS | (columns or {}),
    }
    return Service.model_validate(table | keys)


def site(timezone: str = "Etc/UTC", name: str = "Mill") -> Site:
    here = Path("mill")
    return Site(folder=here, file=here, name=name, timezone=timezone, store=here)


def test_they_are_64_hexadecimal_digits_and_repeat() -> None:
    for digest in (map_digest(site(), made()), derivation_digest(site(), made(), "1")):
        assert len(digest) == 64
        assert set(digest) <= set("0123456789abcdef")
    assert map_digest(site(), made()) == map_digest(site(name="Other"), made())


@pytest.mark.parametrize(
    "columns",
    [{"v_b": "V"}, {"stamp": "end"}, {"decimal": ","}, {"scale": {"v_a": 2}}, {"missing": ["x"]}],
    ids=str,
)
def test_the_map_digest_covers_the_whole_map(columns: dict[str, Any]) -> None:
    assert map_digest(site(), made(columns)) != map_digest(site(), made())


def test_the_map_digest_covers_id_and_zone_and_not_the_rest_of_the_service() -> None:
    before = map_digest(site(), made())
    assert map_digest(site("Europe/Lisbon"), made()) != before
    assert map_digest(site(), made(id="annex")) != before
    assert map_digest(site(), made(name="Other", rating_a=1, files=["x"])) == before
    assert map_digest(site(), made({"pf_unit": "fraction"})) == before
    without = made().model_copy(update={"columns": None})
    assert map_digest(site(), without) != before


@pytest.mark.parametrize(
    "keys",
    [
        {"connection": "delta-3w"},
        {"phase_sequence": "acb"},
        {"nominal_voltage_v": 480},
        {"rating_a": 400},
        {"light_load_fraction": 0.05},
        {"columns": {"assume": "leading"}},
        {"columns": {"pf_unit": "percent"}},
        {"columns": {"pf_kind": "displacement"}},
        {"columns": {"meter_elements": 2}},
        {"columns": {"total_pf_kind": "arithmetic"}},
    ],
    ids=str,
)
def test_the_derivation_digest_covers_what_formulas_use(keys: dict[str, Any]) -> None:
    columns = keys.pop("columns", None)
    changed = made(columns, **keys)
    assert derivation_digest(site(), changed, "1") != derivation_digest(site(), made(), "1")


def test_the_derivation_digest_covers_edition_and_zone_and_not_more() -> None:
    before = derivation_digest(site(), made(), "1")
    assert derivation_digest(site(), made(), "2") != before
    assert derivation_digest(site("Europe/Lisbon"), made(), "1") != before
    same = made({"v_b": "V", "decimal": ","}, name="Other", target_pf=0.9, demand_window_min=30)
    assert derivation_digest(site(), same, "1") == before
