"""Loading a site: what comes out, and errors that name the file, the line and the key."""

from __future__ import annotations

from pathlib import Path

import pytest

from meterlens.errors import SettingsError
from meterlens.settings import find_site, load_site

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
MAP = 'timestamp = "T"\nclock = "utc"\nstamp = "end"\nv_a = "U"\n'


def write(folder: Path, text: str, name: str = "site.toml") -> Path:
    file = folder / name
    file.parent.mkdir(parents=True, exist_ok=True)
    file.write_text(text, "utf-8")
    return file


def error_of(folder: Path, text: str) -> SettingsError:
    write(folder, text)
    with pytest.raises(SettingsError) as caught:
        load_site(folder)
    return caught.value


def facts(error: SettingsError) -> tuple[str, int | None, str | None]:
    return Path(error.file or "").name, error.line, error.key


def test_a_site_is_loaded_with_paths_beside_its_file(tmp_path: Path) -> None:
    extra = 'store = "kept/here.duckdb"\ntariff = "tariff.toml"\n'
    write(tmp_path, SITE.replace("\n\n[[service]]", f"\n{extra}\n[[service]]", 1))
    site = load_site(tmp_path)
    assert site.folder == tmp_path
    assert site.file == tmp_path / "site.toml"
    assert site.store == tmp_path / "kept" / "here.duckdb"
    assert site.tariff == tmp_path / "tariff.toml"
    assert (site.currency, site.limits, site.sums) == ("EUR", "en", ())
    assert [each.id for each in site.services] == ["main"]


def test_the_file_itself_can_be_named(tmp_path: Path) -> None:
    file = write(tmp_path, SITE)
    assert load_site(file) == load_site(tmp_path)


def test_the_nearest_site_upward_is_found(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write(tmp_path, "")
    inner = write(tmp_path / "inner", SITE)
    deep = tmp_path / "inner" / "exports" / "old"
    deep.mkdir(parents=True)
    assert find_site(deep) == inner
    monkeypatch.chdir(deep)
    assert load_site().folder == tmp_path / "inner"


def test_no_site_upward_says_how_to_make_one(tmp_path: Path) -> None:
    with pytest.raises(SettingsError, match="meterlens init DIR"):
        find_site(tmp_path)
    with pytest.raises(SettingsError, match="meterlens init DIR"):
        load_site(tmp_path)
    with pytest.raises(SettingsError, match="no such folder"):
        load_site(tmp_path / "none")


@pytest.mark.parametrize(
    ("old", "new", "line", "key", "words"),
    [
        ('"Europe/Lisbon"', '"Europe/Lisbn"', 3, "site.timezone", '"Europe/Lisbon"'),
        ('timezone = "Europe/Lisbon"', "", 1, "site.timezone", "is required"),
        ("rating_a = 800", "ratng_a = 800", 10, "service.ratng_a", 'Did you mean "rating_a"'),
        ("rating_a = 800", "", 5, "service.rating_a", "is required"),
        ("rating_a = 800", 'rating_a = "800"', 10, "service.rating_a", "without quotes"),
        ("rating_a = 800", "rating_a = -1", 10, "service.rating_a", "above 0, and is -1"),
        ('"wye-4w"', '"wye4w"', 8, "service.connection", 'Did you mean "wye-4w"'),
        ('id = "main"', 'id = "Main"', 6, "service.id", "small letters"),
        ("rating_a = 800", 'rating_a = 8\nlimits = "en"', 11, "service.limits", "[site]"),
        ("rating_a = 800", "rating_a = 8\nfiles = 'x'", 11, "service.files", "list in brackets"),
        ("rating_a = 800", "rating_a = 8\nzip = { z = 0.1, q = 1 }", 11, "service.zip.q", ""),
        ("rating_a = 800", "rating_a = 8\nzip.z = 1\nzip.qq = 1", 12, "service.zip.qq", ""),
        (
            "rating_a = 800",
            "rating_a = 8\nvoltage_band_pu = [\n  0.9,\n  'x',\n]",
            13,
            "service.voltage_band_pu",
            "must be a number",
        ),
        ("[[service]]", "[service]", 5, "service", "[[service]]"),
        ("[[service]]", "[[services]]\n[[service]]", 5, "services", 'Did you mean "service"'),
        ("[site]", "[sites]", 1, "sites", 'Did you mean "site"'),
        ("clock", "clok", 14, "service.columns.clok", 'Did you mean "clock"'),
        ('clock = "local"', "", 12, "service.columns.clock", "is required"),
        ("v_a =", "v_aa =", 16, "service.columns.v_aa", 'Did you mean "v_a"'),
        ('v_a = "U"', 'pf_a = "U"', 12, "service.columns.pf_convention", "nothing is guessed"),
        (
            'v_a = "U"',
            'v_a = "U"\nscale = { i_a = 10 }',
            17,
            "service.columns.scale.i_a",
            "no such column",
        ),
        (
            "[service.columns]",
            "[service.periods.lowpf]\nenter = 0.9\n[service.columns]",
            12,
            "service.periods.lowpf",
            'Did you mean "low-pf"',
        ),
        (
            "[service.columns]",
            "[service.periods.low-pf]\nentr = 0.9\n[service.columns]",
            13,
            "service.periods.low-pf.entr",
            'Did you mean "enter"',
        ),
        (
            "[service.columns]",
            "periods.overload.leave = 1.0\nperiods.overload.enter = 0.9\n[service.columns]",
            12,
            "service.periods.overload.leave",
            "ends below",
        ),
    ],
    ids=str,
)
def test_one_planted_error(
    tmp_path: Path, old: str, new: str, line: int, key: str, words: str
) -> None:
    error = error_of(tmp_path, SITE.replace(old, new, 1))
    assert facts(error) == ("site.toml", line, key)
    assert words in str(error)
    assert "more error" not in str(error)


def test_multi_line_strings_are_no_keys(tmp_path: Path) -> None:
    decoy = 'name = """\nrating_a = 1\n[[service]]\nrating_b = 2"""'
    text = SITE.replace('name = "Main"', decoy).replace("rating_a = 800", "rating_b = 800")
    assert facts(error_of(tmp_path, text)) == ("site.toml", 13, "service.rating_b")


def test_the_second_service_is_told_from_the_first(tmp_path: Path) -> None:
    second = SITE[SITE.index("[[service]]") :]
    error = error_of(tmp_path, SITE + second)
    assert facts(error) == ("site.toml", 18, "service.id")
    assert '"main" is taken already' in str(error)
    text = SITE + second.replace("main", "annex").replace("800", "0")
    assert facts(error_of(tmp_path, text)) == ("site.toml", 22, "service.rating_a")


def test_of_several_errors_the_first_by_line_is_told_with_the_count(tmp_path: Path) -> None:
    text = SITE.replace("800", "0").replace("400", "'x'").replace("Lisbon", "Lisbo")
    error = error_of(tmp_path, text)
    assert facts(error) == ("site.toml", 3, "site.timezone")
    assert "(2 more errors after this one.)" in str(error)
    error = error_of(tmp_path, SITE.replace("800", "0").replace("400", "0"))
    assert facts(error) == ("site.toml", 9, "service.nominal_voltage_v")
    assert "(1 more error after this one.)" in str(error)


def with_map(name: str = "maps/logger.toml") -> str:
    head, _ = SITE.split("[service.columns]")
    return head.rstrip() + f'\ncolumns = "{name}"\n'


def test_a_map_in_its_own_file(tmp_path: Path) -> None:
    write(tmp_path, MAP, "maps/logger.toml")
    write(tmp_path, with_map())
    columns = load_site(tmp_path).services[0].columns
    assert columns is not None
    assert (columns.clock, columns.v_a) == ("utc", "U")


def test_an_error_in_a_map_file_names_that_file(tmp_path: Path) -> None:
    write(tmp_path, "# logger\n" + MAP.replace("\nstamp =", "\nstmp ="), "maps/logger.toml")
    error = error_of(tmp_path, with_map())
    assert facts(error) == ("logger.toml", 4, "stmp")
    assert 'Did you mean "stamp"' in str(error)


def test_a_shared_map_tells_its_error_once(tmp_path: Path) -> None:
    write(tmp_path, MAP + "pf_x = 'PF'\n", "maps/logger.toml")
    one = with_map()
    two = one[one.index("[[service]]") :].replace("main", "annex")
    error = error_of(tmp_path, one + "\n" + two)
    assert facts(error) == ("logger.toml", 5, "pf_x")
    assert "more error" not in str(error)


def test_site_toml_is_told_before_map_files(tmp_path: Path) -> None:
    write(tmp_path, "v_a = 'U'\n", "maps/logger.toml")
    error = error_of(tmp_path, with_map().replace("800", "0"))
    assert facts(error) == ("site.toml", 10, "service.rating_a")
    assert "(3 more errors" in str(error)


def test_a_missing_key_of_a_map_file_stands_at_its_first_line(tmp_path: Path) -> None:
    write(tmp_path, MAP.replace('clock = "utc"', ""), "maps/logger.toml")
    assert facts(error_of(tmp_path, with_map())) == ("logger.toml", 1, "clock")


def test_a_map_file_with_a_table_around_its_keys(tmp_path: Path) -> None:
    write(tmp_path, "[columns]\n" + MAP, "maps/logger.toml")
    error = error_of(tmp_path, with_map())
    assert facts(error) == ("logger.toml", 1, "columns")
    assert "top level" in str(error)


def test_a_map_file_that_is_not_there(tmp_path: Path) -> None:
    error = error_of(tmp_path, with_map("maps/none.toml"))
    assert facts(error) == ("site.toml", 11, "service.columns")
    assert 'no map file "maps/none.toml"' in str(error)


def test_an_error_reads_as_sentences(tmp_path: Path) -> None:
    error = error_of(tmp_path, SITE.replace('"local"', '"Local"'))
    expected = 'must be local, local-standard, utc or offset, and is "Local". Did you mean "local"?'
    assert str(error) == f"{tmp_path / 'site.toml'}:14: service.columns.clock: {expected}"
    error = error_of(
        tmp_path, SITE.replace("rating_a = 800", "voltage_band_pu = [1]\nrating_a = 8")
    )
    assert error.message == "needs at least 2 entries."


def test_columns_of_another_shape(tmp_path: Path) -> None:
    error = error_of(tmp_path, with_map().replace('"maps/logger.toml"', "3"))
    assert facts(error) == ("site.toml", 11, "service.columns")
    assert "must be a table, and is 3" in str(error)


@pytest.mark.parametrize(
    ("old", "new", "line"),
    [
        ("rating_a = 800", "rating_a = ", 10),
        ("rating_a = 800", "rating_a = 800\nrating_a = 900", 11),
        ("[service.columns]", "[service.columns", 12),
        ('v_a = "U"\n', 'v_a = """\nopen', 17),
    ],
)
def test_a_syntax_error_names_its_line(tmp_path: Path, old: str, new: str, line: int) -> None:
    error = error_of(tmp_path, SITE.replace(old, new, 1))
    assert facts(error) == ("site.toml", line, None)
    assert "is no valid TOML" in str(error)
    assert "(at" not in str(error)


def test_a_byte_order_mark_and_other_line_ends_do_no_harm(tmp_path: Path) -> None:
    text = SITE.replace("800", "0").replace("\n", "\r\n")
    (tmp_path / "site.toml").write_bytes(b"\xef\xbb\xbf" + text.encode())
    with pytest.raises(SettingsError) as caught:
        load_site(tmp_path)
    assert facts(caught.value) == ("site.toml", 10, "service.rating_a")


def test_a_file_that_is_not_utf_8(tmp_path: Path) -> None:
    text = SITE.replace('name = "Main"', 'name = "Grüße"')
    (tmp_path / "site.toml").write_bytes(text.encode("latin-1"))
    with pytest.raises(SettingsError, match="is not UTF-8 text") as caught:
        load_site(tmp_path)
    assert caught.value.line == 7
