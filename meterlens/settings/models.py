"""A site and its metered services, as settings say they are."""

from __future__ import annotations

from collections.abc import Mapping
from importlib import resources
from pathlib import Path
from typing import Annotated, Literal

from pydantic import Field, field_validator, model_validator

from meterlens.errors import RequestError
from meterlens.settings.column_map import ColumnMap
from meterlens.settings.kinds import (
    Fraction,
    Identifier,
    NotNegative,
    Number,
    Phase,
    Positive,
    Settings,
    Text,
    TrueFalse,
    fault,
    nearest,
)

__all__ = [
    "PERIOD_KINDS",
    "PeriodKind",
    "PeriodRule",
    "Service",
    "Site",
    "SiteFile",
    "SiteTable",
    "Sum",
    "ZipMix",
]

PeriodKind = Literal[
    "low-pf", "leading", "current-imbalance", "voltage-imbalance", "voltage", "overload"
]
PERIOD_KINDS: tuple[PeriodKind, ...] = (
    "low-pf",
    "leading",
    "current-imbalance",
    "voltage-imbalance",
    "voltage",
    "overload",
)
# Kinds that begin where the measure falls below their limit, not where it rises above.
_FALLING = {"low-pf", "leading"}


class PeriodRule(Settings):
    """A service's own rule for one kind of period; None keeps the profile's.

    `enter` and `leave` are in the measure's own unit (fractions); `minimum_min` is in
    minutes; `load_floor_fraction` is a fraction of the rating.
    """

    enter: Positive | None = None
    leave: Positive | None = None
    minimum_min: NotNegative | None = None
    load_floor_fraction: Fraction | None = None


class ZipMix(Settings):
    """A load's voltage behaviour: the shares of constant Z, constant I and constant P."""

    z: Number = 0.0
    i: Number = 0.0
    p: Number = 0.0

    @model_validator(mode="after")
    def _adds_to_one(self) -> ZipMix:
        total = self.z + self.i + self.p
        if abs(total - 1) > 1e-6:
            raise fault(f"z + i + p must be 1, and is {total:g}")
        return self


class Service(Settings):
    """One metered three-phase service; units are in the names (V, A, kVA, ohm, minutes).

    `rating_a` is per phase; `nominal_voltage_v` is line-to-line.
    """

    id: Identifier
    name: Text
    connection: Literal["wye-4w", "delta-3w", "delta-4w"]
    high_leg: Phase | None = None
    phase_sequence: Literal["abc", "acb"] = "abc"
    phase_labels: tuple[Text, Text, Text] = ("L1", "L2", "L3")
    nominal_voltage_v: Positive
    frequency_hz: Positive = 50.0
    rating_a: Positive
    breaker_continuous_percent: Literal[80, 100] = 80
    conductor_ampacity_a: Positive | None = None
    transformer_kva: Positive | None = None
    transformer_z_percent: Annotated[Positive, Field(lt=100)] | None = None
    transformer_x_over_r: NotNegative | None = None
    source_r_ohm: NotNegative | None = None
    source_x_ohm: NotNegative | None = None
    neutral_r_ohm: NotNegative | None = None
    neutral_x_ohm: NotNegative | None = None
    fault_level_kva: Positive | None = None
    fault_x_over_r: NotNegative | None = None
    demand_window_min: Annotated[int, Field(strict=True, gt=0, le=1440)] = 15
    demand_kind: Literal["block", "sliding"] = "block"
    billing_kva: Literal["vector", "arithmetic", "effective"] = "vector"
    target_pf: Annotated[Positive, Field(le=1)] = 0.95
    light_load_fraction: Annotated[Fraction, Field(lt=1)] = 0.02
    voltage_band_pu: tuple[Positive, Positive] = (0.90, 1.10)
    existing_banks_kvar: tuple[Positive, ...] = ()
    generation_on_site: TrueFalse = False
    peak_shaving: TrueFalse = False
    seasonal_load_a: NotNegative = 0.0
    billed_behind_transformer: TrueFalse = False
    meter_class: Text | None = None
    ct_class: Text | None = None
    zip: ZipMix | None = None
    files: tuple[Text, ...] = ()
    columns: ColumnMap | None = None
    periods: Mapping[PeriodKind, PeriodRule] = Field(default_factory=dict)

    @field_validator("demand_window_min")
    @classmethod
    def _divides_a_day(cls, minutes: int) -> int:
        if 1440 % minutes:
            raise fault(f"{minutes} minutes do not divide a day", hint="Usual are 15, 30 and 60.")
        return minutes

    @field_validator("voltage_band_pu")
    @classmethod
    def _rises(cls, band: tuple[float, float]) -> tuple[float, float]:
        if not band[0] < band[1]:
            raise fault("the lower bound must stand first and be the smaller one")
        return band

    @field_validator("phase_labels")
    @classmethod
    def _differ(cls, labels: tuple[str, str, str]) -> tuple[str, str, str]:
        if len(set(labels)) != len(labels):
            raise fault("two phases have the same label")
        return labels

    @model_validator(mode="after")
    def _agrees(self) -> Service:
        if self.connection == "delta-4w" and self.high_leg is None:
            raise fault(
                'is required with connection = "delta-4w": the high leg is never assumed',
                key="high_leg",
                hint="It is the phase whose line-to-neutral voltage is about √3 the others.",
            )
        for kind, rule in self.periods.items():
            _check_rule(kind, rule)
        return self


def _check_rule(kind: PeriodKind, rule: PeriodRule) -> None:
    if kind == "voltage":
        for key in ("enter", "leave"):
            if getattr(rule, key) is not None:
                raise fault(
                    "is not a limit of its own",
                    key=("periods", kind, key),
                    hint="Set voltage_band_pu of the service instead.",
                )
    if rule.enter is None or rule.leave is None or rule.enter == rule.leave:
        return
    if (rule.leave > rule.enter) != (kind in _FALLING):
        side = "above" if kind in _FALLING else "below"
        raise fault(
            f"a period of this kind ends {side} where it begins (enter = {rule.enter:g})",
            key=("periods", kind, "leave"),
        )


class Sum(Settings):
    """A service made of others: energies and powers add, currents only where said."""

    id: Identifier
    name: Text
    plus: Annotated[tuple[Identifier, ...], Field(min_length=1)]
    minus: tuple[Identifier, ...] = ()
    currents: TrueFalse = False


class SiteTable(Settings):
    """The [site] table as written; paths are text, relative to the site's folder."""

    name: Text
    timezone: str
    store: Text = "store.duckdb"
    currency: Text = "EUR"
    limits: Literal["en", "ansi"] = "en"
    tariff: Text | None = None

    @field_validator("timezone")
    @classmethod
    def _known_zone(cls, name: str) -> str:
        known = resources.files("tzdata").joinpath("zones").read_text("utf-8").split()
        if name not in known:
            raise fault(
                f'"{name}" is no IANA time zone',
                hint=nearest(name, known) or 'For example "Europe/Lisbon".',
            )
        return name


class SiteFile(Settings):
    """A whole site.toml as written."""

    site: SiteTable
    service: tuple[Service, ...] = ()
    sum: tuple[Sum, ...] = ()

    @model_validator(mode="after")
    def _ids_agree(self) -> SiteFile:
        services = [service.id for service in self.service]
        taken: set[str] = set()
        for table, entries in (("service", services), ("sum", [each.id for each in self.sum])):
            for at, name in enumerate(entries):
                if name in taken:
                    raise fault(f'"{name}" is taken already', key=(table, at, "id"))
                taken.add(name)
        for at, each in enumerate(self.sum):
            for side, parts in (("plus", each.plus), ("minus", each.minus)):
                for name in parts:
                    if name not in services:
                        raise fault(
                            f'no service "{name}"',
                            key=("sum", at, side),
                            hint=nearest(name, services),
                        )
            if set(each.plus) & set(each.minus):
                raise fault("a service cannot be added and taken away", key=("sum", at, "minus"))
        return self


class Site(Settings):
    """A site with its services.

    `folder` is where site.toml (`file`) stands; `store` and `tariff` are resolved
    against it.
    """

    folder: Path
    file: Path
    name: Text
    timezone: str
    store: Path
    currency: Text = "EUR"
    limits: Literal["en", "ansi"] = "en"
    tariff: Path | None = None
    services: tuple[Service, ...] = ()
    sums: tuple[Sum, ...] = ()

    def service(self, id: str) -> Service:
        """Find a service by its id.

        Parameters
        ----------
        id : str
            The id of a ``[[service]]``.

        Returns
        -------
        Service

        Raises
        ------
        RequestError
            Where the site has no such service; names those it has.
        """
        for service in self.services:
            if service.id == id:
                return service
        known = [service.id for service in self.services]
        near = nearest(id, known)
        has = ", ".join(known) if known else "none"
        raise RequestError(
            f'no service "{id}".',
            file=self.file,
            hint=(f"{near} " if near else "") + f"This site has: {has}.",
        )
