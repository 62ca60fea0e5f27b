"""Limits: each with its source, and what a service's own settings make of them."""

from __future__ import annotations

import dataclasses
import math
from typing import Any

import pytest

from meterlens import limits
from meterlens.errors import SettingsError
from meterlens.limits import Limit, Profile, effective_period_rules, period_rules
from meterlens.settings import PERIOD_KINDS, Service

PROFILES: tuple[Profile, ...] = ("en", "ansi")


def service(**keys: Any) -> Service:
    table = {
        "id": "main",
        "name": "Main",
        "connection": "wye-4w",
        "nominal_voltage_v": 400,
        "rating_a": 800,
    }
    return Service.model_validate(table | keys)


def every_limit() -> list[Limit]:
    named = [each for each in vars(limits).values() if isinstance(each, Limit)]
    ruled = [rule.limit for profile in PROFILES for rule in period_rules(profile).values()]
    return named + ruled


@pytest.mark.parametrize("limit", every_limit(), ids=lambda limit: limit.name)
def test_every_limit_says_where_it_is_from(limit: Limit) -> None:
    assert limit.name
    assert limit.document
    assert limit.unit in ("fraction", "pu")
    assert limit.status in ("read", "common practice", "from memory")
    with pytest.raises(dataclasses.FrozenInstanceError):
        limit.value = 0.0  # type: ignore[misc]


def test_values() -> None:
    assert limits.CONTINUOUS_FRACTION.value == 0.8
    assert limits.OVERLOAD.value == 1.0
    assert limits.IMPOSSIBLE_PF.value == 1.005
    assert limits.CURRENT_IMBALANCE.value == 0.10
    en, ansi = (limits.voltage_imbalance_limit(profile) for profile in PROFILES)
    assert (en.value, en.document, en.status) == (0.02, "EN 50160", "from memory")
    assert (ansi.value, ansi.document, ansi.status) == (0.03, "ANSI C84.1", "read")
    assert "third party" in ansi.note


def test_the_target_is_the_default_of_a_service_and_near_its_tangent() -> None:
    assert limits.TARGET_PF.value == service().target_pf
    assert math.cos(math.atan(0.33)) == pytest.approx(0.95, abs=5e-4)


RULES = {
    "low-pf": ("pf_vector", None, None, 60, 0.10),
    "leading": ("pf_vector", 0.98, 0.99, 60, 0.02),
    "current-imbalance": ("current_unbalance", 0.10, 0.08, 60, 0.30),
    "voltage": ("voltage_pu", None, None, 0, 0),
    "overload": ("current_utilisation", 1.00, 0.95, 15, 0),
}


@pytest.mark.parametrize("profile", PROFILES)
def test_period_rules(profile: Profile) -> None:
    rules = period_rules(profile)
    assert tuple(rules) == PERIOD_KINDS
    for kind, (measure, enter, leave, minimum, floor) in RULES.items():
        rule = rules[kind]  # type: ignore[index]
        assert (rule.kind, rule.measure, rule.enter, rule.leave) == (kind, measure, enter, leave)
        assert (rule.minimum_min, rule.load_floor_fraction) == (minimum, floor)


def test_voltage_imbalance_has_its_own_measure_in_each_profile() -> None:
    en, ansi = (period_rules(profile)["voltage-imbalance"] for profile in PROFILES)
    assert (en.measure, en.enter, en.leave, en.minimum_min) == ("vuf", 0.02, 0.018, 60)
    assert (ansi.measure, ansi.enter, ansi.leave) == ("lvur", 0.03, 0.027)


def bounds(rule: limits.EffectiveRule) -> tuple[float | None, ...]:
    return rule.enter_low, rule.leave_low, rule.enter_high, rule.leave_high


def test_rules_of_a_service_without_settings() -> None:
    rules = effective_period_rules(service(), "en")
    assert tuple(rules) == PERIOD_KINDS
    assert bounds(rules["low-pf"]) == (0.95, 0.96, None, None)
    assert bounds(rules["leading"]) == (0.98, 0.99, None, None)
    assert bounds(rules["current-imbalance"]) == (None, None, 0.10, 0.08)
    assert bounds(rules["voltage-imbalance"]) == (None, None, 0.02, 0.018)
    assert bounds(rules["voltage"]) == (0.90, 0.905, 1.10, 1.095)
    assert bounds(rules["overload"]) == (None, None, 1.0, 0.95)
    assert rules["low-pf"].limit == limits.TARGET_PF
    assert all(rule.overridden == () for rule in rules.values())


def test_a_service_s_own_values_go_first_and_are_shown_as_its_own() -> None:
    own = service(
        target_pf=0.9,
        voltage_band_pu=[0.94, 1.06],
        periods={
            "voltage-imbalance": {"enter": 0.01},
            "overload": {"leave": 0.8, "minimum_min": 0},
            "current-imbalance": {"load_floor_fraction": 0},
        },
    )
    rules = effective_period_rules(own, "en")
    assert bounds(rules["low-pf"]) == (0.9, 0.91, None, None)
    assert rules["low-pf"].limit.status == "site setting"
    assert rules["low-pf"].limit.clause == "service.target_pf"
    assert bounds(rules["voltage"]) == (0.94, 0.945, 1.06, 1.055)
    assert bounds(rules["voltage-imbalance"]) == (None, None, 0.01, 0.009)
    assert rules["voltage-imbalance"].limit.value == 0.01
    assert rules["voltage-imbalance"].limit.status == "site setting"
    assert rules["voltage-imbalance"].overridden == ("enter",)
    assert bounds(rules["overload"]) == (None, None, 1.0, 0.8)
    assert rules["overload"].minimum_min == 0
    assert rules["overload"].limit.status == "common practice"
    assert rules["overload"].overridden == ("leave", "minimum_min")
    assert rules["current-imbalance"].load_floor_fraction == 0


def test_a_target_of_one_can_still_be_left() -> None:
    rule = effective_period_rules(service(target_pf=1), "en")["low-pf"]
    assert (rule.enter_low, rule.leave_low) == (1.0, 1.0)


def test_a_narrow_band_can_still_be_left() -> None:
    rule = effective_period_rules(service(voltage_band_pu=[0.998, 1.002]), "en")["voltage"]
    assert bounds(rule) == (0.998, 0.999, 1.002, 1.001)


@pytest.mark.parametrize(
    "periods",
    [{"low-pf": {"leave": 0.9}}, {"overload": {"leave": 1.2}}],
    ids=str,
)
def test_a_leave_on_the_wrong_side_is_refused(periods: dict[str, Any]) -> None:
    with pytest.raises(SettingsError, match="where it begins") as caught:
        effective_period_rules(service(periods=periods), "en")
    assert str(caught.value.key).endswith(".leave")
