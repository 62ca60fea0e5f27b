"""Settings: what a site's files say, as plain frozen values."""

from meterlens.settings.column_map import DEFAULT_MISSING, ColumnMap, PfConvention
from meterlens.settings.columns import TEXT_COLUMNS, VALUE_COLUMNS
from meterlens.settings.digests import derivation_digest, map_digest
from meterlens.settings.kinds import nearest
from meterlens.settings.loading import SITE_FILE, find_site, load_site
from meterlens.settings.models import (
    PERIOD_KINDS,
    PeriodKind,
    PeriodRule,
    Service,
    Site,
    Sum,
    ZipMix,
)
from meterlens.settings.new_site import write_new_site
from meterlens.settings.toml_file import TomlFile, read_toml

__all__ = [
    "DEFAULT_MISSING",
    "PERIOD_KINDS",
    "SITE_FILE",
    "TEXT_COLUMNS",
    "VALUE_COLUMNS",
    "ColumnMap",
    "PeriodKind",
    "PeriodRule",
    "PfConvention",
    "Service",
    "Site",
    "Sum",
    "TomlFile",
    "ZipMix",
    "derivation_digest",
    "find_site",
    "load_site",
    "map_digest",
    "nearest",
    "read_toml",
    "write_new_site",
]
