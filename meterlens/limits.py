"""Numbers out of documents and out of practice: the one home of each, with where it is from.

Formulas know no standards and limits know no formulas. A site's own settings go before
what stands here, and are shown as the site's own.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

from meterlens.errors import SettingsError
from meterlens.settings import PERIOD_KINDS, PeriodKind, PeriodRule, Service

__all__ = [
    "CONTINUOUS_FRACTION",
    "CURRENT_IMBALANCE",
    "IMPOSSIBLE_PF",
    "OVERLOAD",
    "POWER_MISMATCH",
    "TARGET_PF",
    "EffectiveRule",
    "Limit",
    "Profile",
    "RuleDefaults",
    "Status",
    "effective_period_rules",
    "period_rules",
    "voltage_imbalance_limit",
]

Profile = Literal["en", "ansi"]
Status = Literal["read", "common practice", "from memory", "site setting"]
Side = Literal["below", "above", "outside"]


@dataclass(frozen=True)
class Limit:
    """A number with its source.

    `value` is in `unit` (often a fraction); None where it is the service's own.
    `status` says whether it was read (and `note` where, if not in the document itself),
    is common practice, is from memory, or is a setting of the site.
    """

    name: str
    value: float | None
    unit: str
    document: str
    edition: str
    clause: str
    status: Status
    note: str = ""


CONTINUOUS_FRACTION = Limit(
    "continuous load over rating", 0.8, "fraction", "NFPA 70 (NEC)", "2023", "215.3, 230.42",
    "from memory", "125 % of continuous load, turned round; 1.0 where marked for 100 %",
)  # fmt: skip
OVERLOAD = Limit(
    "phase current over rating", 1.0, "fraction", "rating of the service or its main breaker",
    "", "", "common practice",
)  # fmt: skip
IMPOSSIBLE_PF = Limit(
    "greatest magnitude of a power factor reading", 1.005, "fraction",
    "half of the last digit of a power factor printed to two decimals", "", "", "common practice",
)  # fmt: skip
TARGET_PF = Limit(
    "target power factor", 0.95, "fraction", "tariffs that bill reactive energy above tan φ = 0.33",
    "", "", "common practice", "tan φ = 0.33 is a power factor of 0.9496",
)  # fmt: skip
CURRENT_IMBALANCE = Limit(
    "current imbalance", 0.10, "fraction", "a utility's general terms of service", "",
    "phases within 10 % of each other at or near maximum load", "common practice",
)  # fmt: skip
POWER_MISMATCH = Limit(
    "metered power against V·I·PF, of S", 0.02, "fraction",
    "this program's choice: above the sum of a class 1 meter's and class 0.5 transformers' errors",
    "", "", "common practice",
)  # fmt: skip
_LEADING = Limit(
    "leading power factor", 0.98, "fraction",
    "this program's choice: clearly leading, not hovering about unity", "", "", "common practice",
)  # fmt: skip
_VOLTAGE_BAND = Limit(
    "voltage band", None, "pu", "voltage_band_pu of the service, ±10 % where not set", "", "",
    "common practice", "EN 50160: ±10 % for 95 % of a week's 10-minute values (from memory)",
)  # fmt: skip
_VOLTAGE_IMBALANCE = {
    "en": Limit(
        "voltage imbalance vuf", 0.02, "fraction", "EN 50160", "2010",
        "supply voltage unbalance: 95 % of the 10-minute values of each week", "from memory",
    ),
    "ansi": Limit(
        "voltage imbalance lvur", 0.03, "fraction", "ANSI C84.1", "",
        "informative annex on voltage unbalance: at the revenue meter, no load", "read",
        "read on a third party's page; the annex's letter differs by edition",
    ),
}  # fmt: skip


@dataclass(frozen=True)
class RuleDefaults:
    """When a period of one kind begins and ends, before a service's own settings.

    A period begins where `measure` goes to the `side` of `enter`, and ends where it is
    back at `leave`; both in `unit`, None where the service's own value counts.
    `leave_margin` leads from one to the other: a difference for the sides below and
    outside, a fraction of `enter` for the side above. Periods shorter than `minimum_min`
    minutes do not count, nor do intervals whose largest phase current is under
    `load_floor_fraction` of the rating. Of the two kinds of ``pf_vector`` (by magnitude),
    low-pf counts lagging intervals only and leading counts those with Q < 0.
    """

    kind: PeriodKind
    measure: str
    side: Side
    enter: float | None
    leave: float | None
    leave_margin: float
    minimum_min: float
    load_floor_fraction: float
    unit: str
    limit: Limit


@dataclass(frozen=True)
class EffectiveRule:
    """One service's rule for one kind of period, its own settings included.

    An interval is inside where `measure` < `enter_low` or > `enter_high`; a period ends
    where it is ≥ `leave_low` and ≤ `leave_high`. A bound that is None does not apply.
    `overridden` names the keys that the service sets itself.
    """

    kind: PeriodKind
    measure: str
    unit: str
    enter_low: float | None
    leave_low: float | None
    enter_high: float | None
    leave_high: float | None
    minimum_min: float
    load_floor_fraction: float
    limit: Limit
    overridden: tuple[str, ...] = ()


def voltage_imbalance_limit(profile: Profile) -> Limit:
    """Return the profile's limit of voltage imbalance.

    Parameters
    ----------
    profile : {"en", "ansi"}
        ``en`` limits ``vuf``, ``ansi`` limits ``lvur``: two measures, not one.

    Returns
    -------
    Limit
        As a fraction.
    """
    return _VOLTAGE_IMBALANCE[profile]


def _rule(
    kind: PeriodKind,
    measure: str,
    side: Side,
    limit: Limit,
    margin: float,
    minimum_min: float,
    floor: float,
) -> RuleDefaults:
    enter = limit.value
    leave = None if enter is None else _back(enter, margin, side)
    return RuleDefaults(
        kind, measure, side, enter, leave, margin, minimum_min, floor, limit.unit, limit
    )  # fmt: skip


def _back(enter: float, margin: float, side: Side) -> float:
    """Go from a limit to the good side of it; a power factor ends at 1."""
    # Rounded, so that 0.95 + 0.01 is the 0.96 that a person would write.
    return round(min(1.0, enter + margin) if side == "below" else enter * (1 - margin), 9)


def period_rules(profile: Profile) -> dict[PeriodKind, RuleDefaults]:
    """Return when periods of each kind begin and end, by default.

    Parameters
    ----------
    profile : {"en", "ansi"}
        The profile of limits.

    Returns
    -------
    dict of str to RuleDefaults
        One for each kind, in the order of `PERIOD_KINDS`.

    Notes
    -----
    Durations, floors and the distance between the two values are this program's choice,
    so that one flickering interval does not make ten periods: common practice at most.
    """
    target = replace(TARGET_PF, value=None)
    imbalance = voltage_imbalance_limit(profile)
    ratio = "vuf" if profile == "en" else "lvur"
    rules = (
        _rule("low-pf", "pf_vector", "below", target, 0.01, 60, 0.10),
        _rule("leading", "pf_vector", "below", _LEADING, 0.01, 60, 0.02),
        _rule("current-imbalance", "current_unbalance", "above", CURRENT_IMBALANCE, 0.2, 60, 0.30),
        _rule("voltage-imbalance", ratio, "above", imbalance, 0.1, 60, 0),
        _rule("voltage", "voltage_pu", "outside", _VOLTAGE_BAND, 0.005, 0, 0),
        _rule("overload", "current_utilisation", "above", OVERLOAD, 0.05, 15, 0),
    )
    return {rule.kind: rule for rule in rules}


def effective_period_rules(service: Service, profile: Profile) -> dict[PeriodKind, EffectiveRule]:
    """Return when periods of each kind begin and end on one service.

    Parameters
    ----------
    service : Service
        Its ``periods``, ``target_pf`` and ``voltage_band_pu`` count.
    profile : {"en", "ansi"}
        The site's profile of limits.

    Returns
    -------
    dict of str to EffectiveRule
        One for each kind, in the order of `PERIOD_KINDS`.

    Raises
    ------
    SettingsError
        Where a service's own ``leave`` is on the wrong side of where periods begin.
    """
    defaults = period_rules(profile)
    return {
        kind: _effective(defaults[kind], service.periods.get(kind, PeriodRule()), service)
        for kind in PERIOD_KINDS
    }


def _effective(rule: RuleDefaults, own: PeriodRule, service: Service) -> EffectiveRule:
    low, leave_low, high, leave_high, limit = _bounds(rule, own, service)
    floor = own.load_floor_fraction
    return EffectiveRule(
        kind=rule.kind,
        measure=rule.measure,
        unit=rule.unit,
        enter_low=low,
        leave_low=leave_low,
        enter_high=high,
        leave_high=leave_high,
        minimum_min=rule.minimum_min if own.minimum_min is None else own.minimum_min,
        load_floor_fraction=rule.load_floor_fraction if floor is None else floor,
        limit=limit,
        overridden=tuple(own.model_dump(exclude_none=True)),
    )


Bounds = tuple[float | None, float | None, float | None, float | None, Limit]


def _bounds(rule: RuleDefaults, own: PeriodRule, service: Service) -> Bounds:
    if rule.side == "outside":
        low, high = service.voltage_band_pu
        margin = min(rule.leave_margin, (high - low) / 4)
        return low, round(low + margin, 9), high, round(high - margin, 9), rule.limit
    default = service.target_pf if rule.enter is None else rule.enter
    enter = default if own.enter is None else own.enter
    leave = _back(enter, rule.leave_margin, rule.side) if own.leave is None else own.leave
    below = rule.side == "below"
    if leave != enter and (leave > enter) != below:
        raise SettingsError(
            f"a period ends {'above' if below else 'below'} where it begins, at {enter:g}.",
            key=f"service.periods.{rule.kind}.leave",
            hint=f'It is set on service "{service.id}".',
        )
    limit = _limit_in_force(rule, own, service)
    return (enter, leave, None, None, limit) if below else (None, None, enter, leave, limit)


def _limit_in_force(rule: RuleDefaults, own: PeriodRule, service: Service) -> Limit:
    """Tell the site's own number from the profile's."""
    if own.enter is not None:
        value, key = own.enter, f"service.periods.{rule.kind}.enter"
    elif rule.enter is None and service.target_pf != TARGET_PF.value:
        value, key = service.target_pf, "service.target_pf"
    else:
        return rule.limit if rule.enter is not None else TARGET_PF
    return Limit(rule.limit.name, value, rule.unit, "site.toml", "", key, "site setting")
