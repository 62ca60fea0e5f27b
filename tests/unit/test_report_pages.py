"""The text of the pages: words, escaping, no way out to a network, same bytes each time."""

from __future__ import annotations

import json
import re
import sys
from collections.abc import Iterator
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import polars as pl
import pytest

from meterlens.errors import RequestError
from meterlens.report.pages import ServiceFacts, ServicePage, page_name, write_pages

sys.path.insert(0, str(Path(__file__).parents[1] / "browser"))
from report_samples import minutes_page, quarters_page

NASTY = "</script><script>alert(1)</script><b>&\"' {{ 7*7 }}"


class Outline(HTMLParser):
    """Collects what a page is made of."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def all(self, tag: str) -> list[dict[str, str | None]]:
        """Return the attributes of every element of one name."""
        return [attrs for name, attrs in self.tags if name == tag]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("pages")
    write_pages(
        "Example Mill", "EUR", (f() for f in (quarters_page, minutes_page)), out, version="9"
    )
    return out


@pytest.fixture(scope="module")
def main_text(folder: Path) -> str:
    return (folder / "main.html").read_text(encoding="utf-8")


def specs(text: str) -> dict[str, dict[str, object]]:
    """Return the figures that a page carries."""
    found = re.findall(r'<script type="application/json" id="spec-([a-z]+)">(.*?)</script>', text)
    return {key: json.loads(body) for key, body in found}


def test_files_and_their_order(folder: Path, tmp_path: Path) -> None:
    written = write_pages("S", "EUR", [quarters_page()], tmp_path, version="9")
    assert [p.name for p in written] == ["index.html", "main.html", "plotly.min.js"]
    assert {p.name for p in folder.iterdir()} == {
        "annex.html",
        "index.html",
        "main.html",
        "plotly.min.js",
    }


def test_every_chart_has_a_name_and_words(main_text: str) -> None:
    outline = Outline(main_text)
    charts = [d for d in outline.all("div") if d.get("role") == "img"]
    assert [c["data-figure"] for c in charts] == list(specs(main_text))
    assert len(charts) == 9
    assert all(len(c["aria-label"] or "") > 20 for c in charts)
    captions = re.findall(r"<figcaption>(.*?)</figcaption>", main_text)
    assert len(captions) == 9
    assert all(len(c) > 60 for c in captions)
    assert "grade: nominal" in main_text
    assert outline.all("html")[0]["lang"] == "en"
    assert len(outline.all("h1")) == 1
    assert "<title>Main switchboard, Example Mill</title>" in main_text


@pytest.mark.parametrize("name", ["index.html", "main.html", "annex.html"])
def test_nothing_points_to_a_network(folder: Path, name: str) -> None:
    text = (folder / name).read_text(encoding="utf-8")
    assert "http:" not in text
    assert "https:" not in text
    assert "default-src &#39;none&#39;" in text
    for tag, attrs in Outline(text).tags:
        for key in ("src", "href", "action", "srcset"):
            target = attrs.get(key)
            assert target is None or re.fullmatch(r"[a-z_]+\.(html|min\.js)|#main", target), tag
    if name != "index.html":
        assert '"showSendToCloud":false' in text


def test_series_are_start_and_step_never_lists_of_times(main_text: str) -> None:
    assert len(re.findall(r"20\d\d-\d\d-\d\d[T ]\d\d:\d\d:\d\d", main_text)) < 20
    for key, spec in specs(main_text).items():
        for trace in spec["traces"]:  # type: ignore[attr-defined]
            if spec["linked"] and trace["type"] == "scatter" and trace["mode"] == "lines":
                assert {"x0", "dx"} <= set(trace), key
                assert "x" not in trace


def test_same_input_same_bytes(folder: Path, tmp_path: Path) -> None:
    write_pages("Example Mill", "EUR", [quarters_page(), minutes_page()], tmp_path, version="9")
    for path in folder.iterdir():
        assert (tmp_path / path.name).read_bytes() == path.read_bytes()


def test_names_are_text_everywhere(tmp_path: Path) -> None:
    page = quarters_page(NASTY)
    service = replace(page.service, phase_labels=(NASTY, "L2", "L3"))
    finding = page.findings[0] | {"text": NASTY, "phase": "a"}
    period = page.periods[0] | {"kind": NASTY, "unit": NASTY, "phase": "a"}
    nasty = replace(page, service=service, findings=[finding], periods=[period])
    write_pages(NASTY, NASTY, [nasty], tmp_path, version=NASTY)
    for name in ("index.html", "main.html"):
        text = (tmp_path / name).read_text(encoding="utf-8")
        assert "alert(1)</script>" not in text
        assert "49" not in re.findall(r"<title>(.*?)</title>", text)[0]
        scripts = [a for a in Outline(text).all("script") if a.get("type") != "application/json"]
        assert len(scripts) == (2 if name == "main.html" else 0)
    labels = {t["name"] for t in specs(text)["currents"]["traces"]}  # type: ignore[attr-defined]
    assert any(label.startswith("&lt;/script&gt;") for label in labels)


def test_single_file_carries_the_library(tmp_path: Path) -> None:
    written = write_pages("S", "EUR", [quarters_page()], tmp_path, version="9", single_file=True)
    assert [p.name for p in written] == ["index.html", "main.html"]
    text = (tmp_path / "main.html").read_text(encoding="utf-8")
    assert len(text) > 4_000_000
    assert not [a for a in Outline(text).all("script") if a.get("src")]


def test_pages_come_one_at_a_time(tmp_path: Path) -> None:
    def pages() -> Iterator[ServicePage]:
        yield quarters_page()
        assert (tmp_path / "main.html").exists()
        yield minutes_page()

    write_pages("S", "EUR", pages(), tmp_path, version="9")


def test_long_record_says_that_it_is_thinned(folder: Path) -> None:
    text = (folder / "annex.html").read_text(encoding="utf-8")
    assert "one point stands for 2 minutes: the highest of its intervals" in text
    assert "One interval in 11 is drawn" in text


def test_service_without_readings_still_has_a_page(tmp_path: Path) -> None:
    bare = ServiceFacts("bare", "Bare", "wye-4w", "Europe/Lisbon")
    empty = quarters_page().frame[:0]
    only_current = quarters_page().frame.select("start_utc", "start_local", "interval_min", "i_a")
    other = replace(bare, id="index")
    pages = [ServicePage(bare, empty), ServicePage(other, only_current)]
    written = write_pages("S", "EUR", pages, tmp_path, version="9")
    assert [p.name for p in written[:3]] == ["index.html", "bare.html", "index_.html"]
    text = written[1].read_text(encoding="utf-8")
    assert "No power is known in this record." in text
    assert specs(text) == {}
    assert set(specs(written[2].read_text(encoding="utf-8"))) == {
        "currents",
        "coverage",
    }


@pytest.mark.parametrize("bad", ["../up", "A", "", "a b", "a\n"])
def test_id_that_cannot_name_a_file_is_refused(bad: str) -> None:
    with pytest.raises(RequestError):
        page_name(bad)


def test_service_given_twice_is_refused(tmp_path: Path) -> None:
    with pytest.raises(RequestError, match="twice"):
        write_pages("S", "EUR", [quarters_page(), quarters_page()], tmp_path, version="9")


def test_three_wire_voltages_are_line_to_line(tmp_path: Path) -> None:
    page = quarters_page()
    names = {"v_a": "v_ab", "v_b": "v_bc", "v_c": "v_ca"}
    frame = page.frame.rename(names).with_columns(pl.col(*names.values()) * np.sqrt(3))
    service = replace(page.service, connection="delta-3w", angle_grade="triangle")
    write_pages("S", "EUR", [replace(page, service=service, frame=frame)], tmp_path, version="9")
    text = (tmp_path / "main.html").read_text(encoding="utf-8")
    assert "Metered line-to-line voltage over its nominal value (400.0 V)" in text
    assert "L1–L2" in text
    assert "grade: triangle" in text
