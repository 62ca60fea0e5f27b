"""What settings accept, and what they refuse."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from pydantic import ValidationError

from meterlens import settings
from meterlens.errors import RequestError
from meterlens.settings import TEXT_COLUMNS, VALUE_COLUMNS, ColumnMap, Service, Site

COLUMNS: dict[str, Any] = {"timestamp": "T", "clock": "local", "stamp": "start", "v_a": "U"}
SERVICE: dict[str, Any] = {
    "id": "main",
    "name": "Main",
    "connection": "wye-4w",
    "nominal_voltage_v": 400,
    "rating_a": 800,
}


def column_map(**keys: Any) -> ColumnMap:
    return ColumnMap.model_validate(COLUMNS | keys)


def service(**keys: Any) -> Service:
    return Service.model_validate(SERVICE | keys)


def refusal(model: Any, **keys: Any) -> str:
    """Return the type, path and text of each error, joined."""
    with pytest.raises(ValidationError) as caught:
        model(**keys)
    return " | ".join(
        f"{each['loc']} {each.get('ctx', {}).get('path', '')} {each['msg']}"
        for each in caught.value.errors()
    )


def test_documented_defaults_of_a_service() -> None:
    made = service()
    assert made.phase_sequence == "abc"
    assert made.phase_labels == ("L1", "L2", "L3")
    assert made.frequency_hz == 50
    assert made.breaker_continuous_percent == 80
    assert (made.demand_window_min, made.demand_kind) == (15, "block")
    assert made.billing_kva == "vector"
    assert (made.target_pf, made.light_load_fraction) == (0.95, 0.02)
    assert made.voltage_band_pu == (0.90, 1.10)
    assert (made.existing_banks_kvar, made.files, made.seasonal_load_a) == ((), (), 0)
    for key in ("generation_on_site", "peak_shaving", "billed_behind_transformer"):
        assert getattr(made, key) is False
    for key in ("high_leg", "meter_class", "zip", "columns", "transformer_kva", "source_x_ohm"):
        assert getattr(made, key) is None
    assert dict(made.periods) == {}


def test_a_service_cannot_be_changed() -> None:
    made = service()
    with pytest.raises(ValidationError):
        made.rating_a = 1.0


@pytest.mark.parametrize(
    ("keys", "at_fault"),
    [
        ({"rating_a": 0}, "rating_a"),
        ({"rating_a": "800"}, "rating_a"),
        ({"rating_a": True}, "rating_a"),
        ({"rating_a": float("inf")}, "rating_a"),
        ({"nominal_voltage_v": -400}, "nominal_voltage_v"),
        ({"nominal_voltage_v": float("nan")}, "nominal_voltage_v"),
        ({"id": "Main"}, "id"),
        ({"id": ""}, "id"),
        ({"id": "a\n"}, "id"),
        ({"name": ""}, "name"),
        ({"connection": "wye"}, "connection"),
        ({"connection": "delta-4w"}, "high_leg"),
        ({"phase_labels": ["R", "S"]}, "phase_labels"),
        ({"phase_labels": ["R", "S", "S"]}, "same label"),
        ({"breaker_continuous_percent": 90}, "breaker_continuous_percent"),
        ({"transformer_z_percent": 100}, "transformer_z_percent"),
        ({"source_r_ohm": -0.1}, "source_r_ohm"),
        ({"demand_window_min": 7}, "divide a day"),
        ({"demand_window_min": 15.0}, "demand_window_min"),
        ({"demand_window_min": 0}, "demand_window_min"),
        ({"target_pf": 1.01}, "target_pf"),
        ({"target_pf": 0}, "target_pf"),
        ({"light_load_fraction": 1}, "light_load_fraction"),
        ({"voltage_band_pu": [1.1, 0.9]}, "voltage_band_pu"),
        ({"voltage_band_pu": [0.9]}, "voltage_band_pu"),
        ({"existing_banks_kvar": [25, 0]}, "existing_banks_kvar"),
        ({"generation_on_site": 1}, "generation_on_site"),
        ({"zip": {"z": 0.5, "i": 0.2, "p": 0.2}}, "must be 1"),
        ({"files": "exports/*.csv"}, "files"),
        ({"ratings_a": 1}, "ratings_a"),
        ({"periods": {"lowpf": {}}}, "lowpf"),
        ({"periods": {"low-pf": {"entry": 0.9}}}, "entry"),
        ({"periods": {"low-pf": {"enter": 0.9, "leave": 0.8}}}, "ends above"),
        ({"periods": {"overload": {"enter": 0.9, "leave": 1.0}}}, "ends below"),
        ({"periods": {"voltage": {"enter": 0.9}}}, "not a limit"),
    ],
)
def test_a_service_refuses(keys: dict[str, Any], at_fault: str) -> None:
    assert at_fault in refusal(service, **keys)


def test_a_service_accepts() -> None:
    made = service(
        connection="delta-4w",
        high_leg="c",
        zip={"z": 0.4, "p": 0.6},
        periods={"low-pf": {"enter": 0.9, "leave": 0.9}, "voltage": {"minimum_min": 5}},
        columns=COLUMNS,
    )
    assert made.zip is not None
    assert made.zip.i == 0
    assert made.periods["voltage"].minimum_min == 5
    assert made.columns is not None
    assert made.columns.timestamp == ("T",)


def test_canonical_columns_are_named_in_a_fixed_order() -> None:
    assert VALUE_COLUMNS[:14] == (
        "v_a", "v_b", "v_c", "v_ab", "v_bc", "v_ca",
        "i_a", "i_b", "i_c", "i_n",
        "pf_a", "pf_b", "pf_c", "pf_total",
    )  # fmt: skip
    assert len(VALUE_COLUMNS) == 46
    made = column_map(i_a="I", v_c="W", lead_lag_a="L")
    assert list(made.value_columns().items()) == [("v_a", "U"), ("v_c", "W"), ("i_a", "I")]
    assert made.text_columns() == {"lead_lag_a": "L"}
    assert not set(VALUE_COLUMNS) & set(TEXT_COLUMNS)


def test_two_columns_make_a_timestamp_and_numbers_name_columns_without_a_header() -> None:
    assert column_map(timestamp=["D", "T"]).timestamp == ("D", "T")
    made = column_map(timestamp=[1, 2], v_a=3, header_row=0)
    assert made.timestamp == (1, 2)
    assert made.value_columns() == {"v_a": 3}


def test_without_pf_and_power_the_convention_is_none() -> None:
    made = column_map()
    assert made.pf_convention == "none"
    assert (made.midnight, made.pf_unit, made.pf_kind) == ("starts-day", "fraction", "true")
    assert (made.total_pf_kind, made.meter_elements, made.thd_base) == ("vector", 3, "fundamental")
    assert "" in made.missing


PF = {"pf_a": "PF"}


@pytest.mark.parametrize(
    "keys",
    [
        PF | {"pf_convention": "unsigned", "assume": "leading"},
        PF | {"pf_convention": "sign-is-power-flow", "assume": "lagging"},
        PF | {"pf_convention": "sign-is-power-flow", "lead_lag_a": "L"},
        PF | {"pf_convention": "sign-is-power-flow", "q_kvar": "Q"},
        PF | {"pf_convention": "sign-is-lead-lag", "lagging_sign": "negative"},
        PF | {"pf_convention": "quadrant", "quadrant_a": "N"},
        PF | {"pf_convention": "suffix"},
        {"pf_convention": "from-power", "p_kw": "P", "q_kvar": "Q"},
        {"pf_convention": "from-power", "p_kw": "P", "s_kva": "S", "assume": "lagging"},
        {"pf_convention": "from-power", "p_kw": "P"},
        {"pf_convention": "none"},
        {"timestamp_format": "%d.%m.%Y %H:%M"},
        {"timestamp_format": "%m/%d/%Y %I:%M %p"},
        {"timestamp_format": "%Y-%m-%dT%H:%M:%S%z", "clock": "offset"},
        {"timestamp_format": "%d-%b-%y"},
        {"timestamp_format": "epoch", "clock": "utc"},
        {"delimiter": ",", "thousands": ",", "decimal": "."},
        {"delimiter": "\t", "encoding": "windows-1252", "thousands": "\u00a0"},
        {"quality": "S", "estimated": ["E"]},
        {"scale": {"v_a": 1000}},
    ],
    ids=str,
)
def test_a_column_map_accepts(keys: dict[str, Any]) -> None:
    column_map(**keys)


@pytest.mark.parametrize(
    ("keys", "at_fault"),
    [
        (PF, "pf_convention"),
        ({"p_kw": "P"}, "pf_convention"),
        ({"energy_kwh": "E"}, "pf_convention"),
        (PF | {"pf_convention": "none"}, "pf_convention"),
        (PF | {"pf_convention": "from-power", "p_kw": "P"}, "pf_convention"),
        (PF | {"pf_convention": "quadrant"}, "pf_convention"),
        ({"pf_convention": "unsigned", "assume": "lagging"}, "pf_convention"),
        ({"pf_convention": "from-power", "q_kvar": "Q"}, "pf_convention"),
        (PF | {"pf_convention": "unsigned"}, "assume"),
        (PF | {"pf_convention": "sign-is-power-flow"}, "assume"),
        ({"pf_convention": "from-power", "p_kw": "P", "s_kva": "S"}, "assume"),
        ({"pf_convention": "from-power", "p_kw": "P", "i_a": "I"}, "assume"),
        (PF | {"pf_convention": "sign-is-lead-lag"}, "lagging_sign"),
        ({"timestamp": []}, "timestamp"),
        ({"timestamp": ["a", "b", "c"]}, "timestamp"),
        ({"timestamp": ["a", "a"]}, "timestamp"),
        ({"timestamp": ""}, "timestamp"),
        ({"timestamp_format": "iso"}, "timestamp_format"),
        ({"timestamp_format": "%d.%m. %H:%M"}, "year, month and day"),
        ({"timestamp_format": "%d.%m.%Y %I:%M"}, "morning from afternoon"),
        ({"timestamp_format": "%Q"}, "timestamp_format"),
        ({"timestamp_format": "%Y-%m-%d %"}, "timestamp_format"),
        ({"timestamp_format": "%Y-%m-%d %H:%M", "clock": "offset"}, "timestamp_format"),
        ({"timestamp_format": "%Y-%m-%d %H:%M%z"}, "clock"),
        ({"clock": "gmt"}, "clock"),
        ({"stamp": None}, "stamp"),
        ({"interval_min": 0}, "interval_min"),
        ({"interval_min": 1441}, "interval_min"),
        ({"v_a": 3}, "header_row"),
        ({"v_a": 3, "header_row": 0}, "timestamp"),
        ({"v_a": 0, "header_row": 0, "timestamp": 1}, "numbered from 1"),
        ({"v_a": True}, "v_a"),
        ({"v_a": " "}, "v_a"),
        ({"v_a": None}, "no column of readings"),
        ({"v_b": "U"}, "mapped already"),
        ({"v_b": "T"}, "mapped already, as timestamp"),
        ({"delimiter": ";;"}, "delimiter"),
        ({"delimiter": ""}, "delimiter"),
        ({"delimiter": "5"}, "delimiter"),
        ({"decimal": ";"}, "decimal"),
        ({"decimal": ",", "thousands": ","}, "thousands"),
        ({"thousands": "0"}, "thousands"),
        ({"encoding": "utf-9"}, "encoding"),
        ({"encoding": "hex"}, "encoding"),
        ({"header_row": -1}, "header_row"),
        ({"missing": "x"}, "missing"),
        ({"quality": "S"}, "estimated"),
        ({"estimated": ["E"]}, "estimated"),
        ({"scale": {"v_a": 0}}, "scale"),
        ({"scale": {"i_a": 10}}, "scale"),
        ({"scale": {"volts": 10}}, "scale"),
        ({"meter_elements": 1}, "meter_elements"),
    ],
    ids=str,
)
def test_a_column_map_refuses(keys: dict[str, Any], at_fault: str) -> None:
    assert at_fault in refusal(column_map, **keys)


def site(*ids: str) -> Site:
    return Site(
        folder=Path("mill"),
        file=Path("mill/site.toml"),
        name="Mill",
        timezone="Etc/UTC",
        store=Path("mill/store.duckdb"),
        services=tuple(service(id=each) for each in ids),
    )


def test_a_site_finds_its_services() -> None:
    assert site("main", "annex").service("annex").id == "annex"


def test_an_unknown_service_is_answered_with_the_known_ones() -> None:
    with pytest.raises(RequestError) as caught:
        site("main", "annex").service("anex")
    assert str(caught.value).startswith('mill/site.toml: no service "anex"')
    assert caught.value.hint == 'Did you mean "annex"? This site has: main, annex.'
    with pytest.raises(RequestError, match="This site has: none"):
        site().service("x")


def test_importing_settings_pulls_in_nothing_heavy() -> None:
    code = "import sys, meterlens.limits; print(*sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    loaded = set(done.stdout.split())
    assert not loaded & {"numpy", "duckdb", "polars", "pandas", "pyarrow", "plotly", "click"}
    rooms = {name for name in loaded if name.startswith("meterlens.")}
    allowed = ("meterlens.settings", "meterlens.errors", "meterlens.limits")
    assert all(name.startswith(allowed) for name in rooms)


def test_public_names() -> None:
    assert sorted(settings.__all__) == sorted(set(settings.__all__))
    assert all(hasattr(settings, name) for name in settings.__all__)
