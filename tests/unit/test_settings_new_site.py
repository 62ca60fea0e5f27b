"""The site folder that `meterlens init` writes."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

from meterlens.errors import SettingsError
from meterlens.settings import (
    TEXT_COLUMNS,
    VALUE_COLUMNS,
    ColumnMap,
    PeriodRule,
    Service,
    load_site,
    write_new_site,
)
from meterlens.settings.models import SiteTable, Sum


def test_the_new_site_loads_as_it_stands(tmp_path: Path) -> None:
    file = write_new_site(tmp_path / "deep" / "mill")
    assert file == tmp_path / "deep" / "mill" / "site.toml"
    assert (file.parent / "exports").is_dir()
    assert (file.parent / "reports").is_dir()
    site = load_site(file.parent)
    assert [service.id for service in site.services] == ["main"]
    assert site.services[0].columns is not None


def test_a_site_that_is_there_is_left_alone(tmp_path: Path) -> None:
    file = tmp_path / "site.toml"
    file.write_text("mine")
    with pytest.raises(SettingsError, match="exists already"):
        write_new_site(tmp_path)
    assert file.read_text() == "mine"


def test_a_file_in_the_way(tmp_path: Path) -> None:
    (tmp_path / "exports").write_text("")
    with pytest.raises(SettingsError, match="in the way"):
        write_new_site(tmp_path)
    with pytest.raises(SettingsError, match="cannot be written"):
        write_new_site(tmp_path / "exports" / "x")


def test_every_key_is_shown(tmp_path: Path) -> None:
    text = write_new_site(tmp_path).read_text("utf-8")
    shown = set(re.findall(r"^(?:# )?([a-z_]+) = ", text, re.MULTILINE))
    others = set(re.findall(r"[a-z_]+", text))
    for model in (SiteTable, Service, PeriodRule, Sum):
        assert set(model.model_fields) - {"columns", "periods"} <= shown
    reading = set(ColumnMap.model_fields) - set(VALUE_COLUMNS) - set(TEXT_COLUMNS)
    assert reading <= shown
    by_stem = {re.sub(r"_(a|b|c|ab|bc|ca|total)(?=_|$)", "", key) for key in VALUE_COLUMNS}
    assert by_stem <= {re.sub(r"_(a|ab)(?=_|$)", "", key) for key in others} | {"pf"}


def test_the_optional_keys_are_right_when_they_are_switched_on(tmp_path: Path) -> None:
    text = write_new_site(tmp_path).read_text("utf-8")
    for line in re.findall(r"^# ([a-z_]+ = .*)$", text, re.MULTILINE):
        assert tomllib.loads(line)
    options = re.findall(r"^# [a-z_]+ = .*$", text.split("# [service.periods")[0], re.MULTILINE)
    for option in options:
        if option.startswith(("# high_leg", "# columns")):
            continue
        (tmp_path / "site.toml").write_text(text.replace(option, option[2:]), "utf-8")
        load_site(tmp_path)
