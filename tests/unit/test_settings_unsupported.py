"""What settings may say that this version cannot do yet, and sums of services."""

from __future__ import annotations

from pathlib import Path

import pytest

from meterlens.errors import SettingsError
from meterlens.settings import load_site

SITE = """\
[site]
name = "Mill"
timezone = "Europe/Lisbon"

[[service]]
id = "main"
name = "Main"
connection = "wye-4w"
nominal_voltage_v = 400
rating_a = 800

[service.columns]
timestamp = "T"
clock = "local"
stamp = "start"
v_a = "U"
"""


def error_of(folder: Path, text: str) -> SettingsError:
    (folder / "site.toml").write_text(text, "utf-8")
    with pytest.raises(SettingsError) as caught:
        load_site(folder)
    return caught.value


def facts(error: SettingsError) -> tuple[str, int | None, str | None]:
    return Path(error.file or "").name, error.line, error.key


SUMS = '[[sum]]\nid = "plant"\nname = "Plant"\nplus = ["main"]\n'
NOT_YET = [
    (SITE.replace('"wye-4w"', '"delta-3w"'), 8, "service.connection"),
    (SITE + 'energy_kwh = "E"\npf_convention = "from-power"\n', 17, "service.columns.energy_kwh"),
    (SITE + 'register_kwh = "E"\npf_convention = "from-power"', 17, "service.columns.register_kwh"),
    (SITE + 'thd_i_a = "H"\n', 17, "service.columns.thd_i_a"),
    (SITE + 'angle_v_a_deg = "A"\n', 17, "service.columns.angle_v_a_deg"),
    (SITE + 'pf_a = "P"\npf_convention = "suffix"\n', 18, "service.columns.pf_convention"),
    (SITE + 'quadrant_a = "N"\n', 17, "service.columns.quadrant_a"),
    (SITE + 'service = "M"\n', 17, "service.columns.service"),
    (SITE + "meter_elements = 2\n", 17, "service.columns.meter_elements"),
    (SITE + 'midnight = "ends-day"\n', 17, "service.columns.midnight"),
    (SITE + SUMS, 17, "sum"),
]


@pytest.mark.parametrize(("text", "line", "key"), NOT_YET, ids=[key for _, _, key in NOT_YET])
def test_what_this_version_cannot_do_is_said(
    tmp_path: Path, text: str, line: int, key: str
) -> None:
    error = error_of(tmp_path, text)
    assert facts(error) == ("site.toml", line, key)
    assert error.message.startswith("not supported by this version: ")


@pytest.mark.parametrize(
    ("old", "new", "line", "key", "words"),
    [
        ('["main"]', '["mane"]', 20, "sum.plus", 'Did you mean "main"'),
        ('"plant"', '"main"', 18, "sum.id", "taken already"),
        ('["main"]', "[]", 20, "sum.plus", "at least 1"),
        ('["main"]', '["main"]\nminus = ["main"]', 21, "sum.minus", "added and taken away"),
    ],
)
def test_sums_are_checked(
    tmp_path: Path, old: str, new: str, line: int, key: str, words: str
) -> None:
    error = error_of(tmp_path, SITE + SUMS.replace(old, new, 1))
    assert facts(error) == ("site.toml", line, key)
    assert words in str(error)
