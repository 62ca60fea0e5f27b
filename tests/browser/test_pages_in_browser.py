"""The pages in a real browser, from disk, with no network."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import datetime, timedelta
from importlib import import_module
from pathlib import Path
from typing import Any

import pytest
from report_samples import minutes_page, quarters_page

from meterlens.report.pages import write_pages
from meterlens.report.theme import DARK, LIGHT

pytestmark = pytest.mark.browser

CHROMIUM = Path(os.environ.get("METERLENS_CHROMIUM", "/usr/bin/chromium"))
KEYS = [
    "load",
    "currents",
    "pf",
    "plane",
    "imbalance",
    "voltage",
    "impedance",
    "periods",
    "coverage",
]
MARKS = """() => Object.fromEntries([...document.querySelectorAll('[data-figure]')].map(el => [
    el.dataset.figure,
    [...el.querySelectorAll('path.js-line, path.point, .barlayer path, .heatmaplayer image')]
        .filter(m => { const r = m.getBoundingClientRect(); return r.width + r.height > 1; }).length
]))"""
RANGES = """() => [...document.querySelectorAll('[data-figure]')]
    .filter(el => el._fullLayout.xaxis.type === 'date')
    .map(el => el._fullLayout.xaxis.range.map(
        v => new Date(el._fullLayout.xaxis.d2l(v)).toISOString().slice(0, 19)).join(' to '))"""


@dataclass
class Visit:
    """An open page and what it said and asked for."""

    page: Any
    said: list[str] = field(default_factory=list)
    asked: list[str] = field(default_factory=list)


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("site")
    write_pages("Example Mill", "EUR", [quarters_page(), minutes_page()], out, version="9")
    single = out / "single"
    write_pages("Example Mill", "EUR", [quarters_page()], single, version="9", single_file=True)
    return out


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    if os.environ.get("METERLENS_REQUIRE_BROWSER"):
        assert CHROMIUM.exists(), f"no Chromium at {CHROMIUM}, and these tests are required"
        api: Any = import_module("playwright.sync_api")
    else:
        api = pytest.importorskip("playwright.sync_api", reason="playwright is not installed")
    if not CHROMIUM.exists():
        pytest.skip(f"no Chromium at {CHROMIUM}; METERLENS_CHROMIUM may name one")
    with api.sync_playwright() as play:
        opened = play.chromium.launch(executable_path=str(CHROMIUM), args=["--no-sandbox"])
        yield opened
        opened.close()


def until(page: Any, expression: str, wanted: Callable[[Any], bool]) -> Any:
    """Wait for a value; the page's policy rightly forbids the driver's own waiting script."""
    for _ in range(300):
        value = page.evaluate(expression)
        if wanted(value):
            return value
        page.wait_for_timeout(100)
    raise AssertionError(f"{expression} stayed at {value!r}")


def visit(browser: Any, path: Path, *, width: int = 1280, scheme: str = "light") -> Visit:
    """Open a page from disk and wait until its charts are drawn."""
    context = browser.new_context(
        viewport={"width": width, "height": 900}, color_scheme=scheme, offline=True
    )
    seen = Visit(context.new_page())
    seen.page.on("console", lambda message: seen.said.append(message.text))
    seen.page.on("pageerror", lambda error: seen.said.append(str(error)))
    seen.page.on("request", lambda request: seen.asked.append(request.url))
    seen.page.goto(path.as_uri())
    if not path.name.startswith("index"):
        seen.page.wait_for_selector("body[data-charts=drawn]", timeout=90_000)
    return seen


@pytest.mark.parametrize("name", ["main.html", "annex.html", "single/main.html"])
def test_every_chart_draws_marks_without_a_word_or_a_request(
    browser: Any, folder: Path, name: str
) -> None:
    seen = visit(browser, folder / name)
    marks = seen.page.evaluate(MARKS)
    seen.page.context.close()
    assert seen.said == []
    assert all(url.startswith("file:") for url in seen.asked), seen.asked
    assert len(seen.asked) == (1 if name.startswith("single") else 2)
    # The annex has no periods, and says so in words.
    assert list(marks) == [k for k in KEYS if k != "periods" or name != "annex.html"]
    least = {"plane": 500, "periods": 10, "currents": 4, "load": 3, "voltage": 3, "impedance": 8}
    for key, count in marks.items():
        assert count >= least.get(key, 1), (key, count)


@pytest.mark.parametrize("name", ["index.html", "main.html", "annex.html"])
@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_small_screen_does_not_scroll_sideways(
    browser: Any, folder: Path, name: str, scheme: str
) -> None:
    seen = visit(browser, folder / name, width=320, scheme=scheme)
    width = seen.page.evaluate("document.documentElement.scrollWidth")
    seen.page.context.close()
    assert width <= 320
    assert seen.said == []


def _rgb(colour: str) -> str:
    return "rgb({}, {}, {})".format(*(int(colour[k : k + 2], 16) for k in (1, 3, 5)))


def test_dark_page_has_dark_charts_and_follows_a_change(browser: Any, folder: Path) -> None:
    seen = visit(browser, folder / "main.html", scheme="dark")
    paper = "getComputedStyle(document.querySelector('#chart-load .main-svg')).backgroundColor"
    ground = "getComputedStyle(document.body).backgroundColor"
    assert seen.page.evaluate(paper) == _rgb(DARK["paper"])
    assert seen.page.evaluate(ground) == _rgb(DARK["page"])
    dark = seen.page.locator("#chart-load").screenshot()
    seen.page.emulate_media(color_scheme="light")
    until(seen.page, paper, lambda colour: colour == _rgb(LIGHT["paper"]))
    light = seen.page.locator("#chart-load").screenshot()
    seen.page.context.close()
    assert dark != light
    assert seen.said == []


def test_charts_move_together(browser: Any, folder: Path) -> None:
    seen = visit(browser, folder / "main.html")
    page = seen.page
    whole = set(page.evaluate(RANGES))
    assert len(whole) == 1
    page.locator("#chart-load").scroll_into_view_if_needed()
    box = page.locator("#chart-load .nsewdrag").first.bounding_box()
    middle = box["y"] + box["height"] / 2
    page.mouse.move(box["x"] + box["width"] * 0.3, middle)
    page.mouse.down()
    page.mouse.move(box["x"] + box["width"] * 0.5, middle, steps=5)
    page.mouse.up()
    part = until(page, RANGES, lambda r: len(set(r)) == 1 and set(r) != whole)
    choice = page.get_by_role("combobox", name="Show")
    assert choice.input_value() == ""
    choice.select_option("one week")
    week = until(page, RANGES, lambda r: len(set(r)) == 1 and r != part)
    start, end = (datetime.fromisoformat(stamp) for stamp in week[0].split(" to "))
    assert end - start == timedelta(days=7)
    page.get_by_role("button", name="Later").click()
    later = until(page, RANGES, lambda r: len(set(r)) == 1 and r != week)
    assert later[0].startswith(end.isoformat())
    assert choice.input_value() == "7"
    choice.select_option("whole record")
    until(page, RANGES, lambda r: set(r) == whole)
    assert choice.input_value() == "0"
    page.context.close()
    assert seen.said == []


def test_time_is_chosen_by_keys_alone(browser: Any, folder: Path) -> None:
    seen = visit(browser, folder / "main.html")
    page = seen.page
    whole = page.evaluate(RANGES)
    page.locator("#span").focus()
    page.keyboard.press("ArrowDown")
    month = until(page, RANGES, lambda r: len(set(r)) == 1 and r != whole)
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.textContent") == "Earlier"
    page.keyboard.press("Enter")
    until(page, RANGES, lambda r: len(set(r)) == 1 and r != month)
    later = page.get_by_role("button", name="Later")
    later.click()
    until(page, RANGES, lambda r: r == month)
    assert later.get_attribute("aria-disabled") == "true"
    page.context.close()
    assert seen.said == []


def test_small_screen_stacks_findings_and_marks_wide_tables(browser: Any, folder: Path) -> None:
    seen = visit(browser, folder / "main.html", width=360)
    page = seen.page
    cells = page.get_by_role("region", name="Findings").get_by_role("cell")
    assert cells.count() > 10
    for box in cells.evaluate_all("cells => cells.map(c => c.getBoundingClientRect().toJSON())"):
        assert 0 <= box["left"] < box["right"] <= 360
    assert page.get_by_role("region", name="Findings").get_by_text("scroll").is_hidden()
    assert page.get_by_role("region", name="How it ran").get_by_text("scroll →").is_visible()
    page.context.close()


@pytest.mark.parametrize("name", ["main.html", "annex.html"])
def test_tables_fit_a_desk_screen(browser: Any, folder: Path, name: str) -> None:
    seen = visit(browser, folder / name)
    wide = seen.page.evaluate(
        "[...document.querySelectorAll('.sheet')].filter(s => s.scrollWidth > s.clientWidth + 1)"
        ".map(s => s.getAttribute('aria-label'))"
    )
    seen.page.context.close()
    assert wide == []


def test_hostile_names_run_nothing(browser: Any, tmp_path: Path) -> None:
    nasty = "</script><img src=x onerror=\"document.title='run'\"><b>{{ 7*7 }}"
    write_pages(nasty, "EUR", [quarters_page(nasty)], tmp_path, version="9")
    seen = visit(browser, tmp_path / "main.html")
    title = seen.page.title()
    heading = seen.page.locator("h1").inner_text()
    seen.page.context.close()
    assert title == f"{nasty}, {nasty}"
    assert heading == nasty
    assert seen.said == []
