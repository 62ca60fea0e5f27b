"""The site's pages: an index and one page a service, standing alone without a network.

Each page carries its own styles, its script and its series; the chart library lies once
beside the pages, or inside each of them. A content policy in the page itself forbids
everything that the page does not carry. The same input gives the same bytes.
"""

from __future__ import annotations

import base64
import hashlib
import json
from collections.abc import Iterable
from functools import cache
from importlib import resources
from pathlib import Path
from typing import Any, Final

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup
from plotly.offline import get_plotlyjs  # type: ignore[import-untyped]

from meterlens.errors import RequestError
from meterlens.report import figures_balance, figures_load, figures_plane, figures_record, tables
from meterlens.report.facts import ServiceFacts, ServicePage
from meterlens.report.findings_table import all_findings, count_words, findings_table
from meterlens.report.months_tables import months_tables
from meterlens.report.record import lay_out
from meterlens.report.summaries import (
    Summary,
    fact_list,
    newest,
    page_name,
    readouts_of,
    summarise,
)
from meterlens.report.theme import CONFIG, DARK, LIGHT, Figure
from meterlens.report.words import ASSUMED_SENSE, CURRENT_GRADES, VOLTAGE_GRADES

__all__ = ["ServiceFacts", "ServicePage", "page_name", "write_pages"]

LIBRARY: Final = "plotly.min.js"


def write_pages(
    site_name: str,
    currency: str,
    pages: Iterable[ServicePage],
    out: Path,
    *,
    version: str,
    single_file: bool = False,
) -> list[Path]:
    """Write the index and one page a service.

    Parameters
    ----------
    site_name, currency : str
        The site's name and the currency of its costs, as people read them.
    pages : iterable of ServicePage
        One a service; read one at a time, so a generator keeps one in memory.
    out : Path
        Folder of the pages; made where it does not exist.
    version : str
        Version of the program, for the foot of the page.
    single_file : bool
        Put the chart library inside every service page instead of beside it.

    Returns
    -------
    list of Path
        The files written, the index first.

    Raises
    ------
    RequestError
        Where a service's id cannot name a file or comes twice.
    """
    out.mkdir(parents=True, exist_ok=True)
    common = {"site_name": site_name, "currency": currency, "version": version}
    summaries: list[Summary] = []
    written: list[Path] = []
    for page in pages:
        path = out / page_name(page.service.id)
        if path in written:
            raise RequestError(f"service {page.service.id!r} is given twice.")
        _write(path, _service_text(page, common, single_file=single_file))
        summaries.append(summarise(page))
        written.append(path)
    index = out / "index.html"
    _write(index, _index_text(summaries, common))
    if not single_file and written:
        _write(out / LIBRARY, get_plotlyjs())
        written.append(out / LIBRARY)
    return [index, *written]


def _write(path: Path, text: str) -> None:
    path.write_text(text, encoding="utf-8", newline="\n")


@cache
def _environment() -> Environment:
    return Environment(
        loader=PackageLoader("meterlens.report", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )


@cache
def _asset(name: str) -> str:
    return (resources.files("meterlens.report") / "templates" / name).read_text(encoding="utf-8")


def _styles() -> Markup:
    light = "".join(f"--{k}:{v};" for k, v in LIGHT.items())
    dark = "".join(f"--{k}:{v};" for k, v in DARK.items())
    roots = f":root{{{light}}}\n@media (prefers-color-scheme: dark){{:root{{{dark}}}}}\n"
    return Markup(roots + _asset("page.css"))  # our own file, no outside text


def _json(value: Any) -> Markup:
    """Return JSON that cannot leave its script element."""
    text = json.dumps(value, allow_nan=False, ensure_ascii=False, separators=(",", ":"))
    for mark in "<>&\u2028\u2029":
        text = text.replace(mark, f"\\u{ord(mark):04x}")
    return Markup(text)  # every character that could end the element is escaped


def _allowed(*scripts: str) -> str:
    """Return the content policy: only these very scripts, nothing from anywhere else."""
    prints = [
        f"'sha256-{base64.b64encode(hashlib.sha256(s.encode()).digest()).decode()}'"
        for s in scripts
    ]
    return (
        f"default-src 'none'; script-src {' '.join(prints)} 'self'; "
        "style-src 'unsafe-inline'; img-src data: blob:; base-uri 'none'; form-action 'none'"
    )


def _figures(page: ServicePage) -> list[Figure]:
    record = lay_out(page.service, page.frame)
    return [
        figures_load.load(record, page.months),
        figures_load.currents(record),
        figures_load.power_factor(record),
        figures_plane.plane(record, page.frame),
        figures_balance.imbalance(record),
        figures_balance.voltage(record),
        figures_balance.impedance(record),
        figures_record.periods(record, page.periods),
        figures_record.coverage(record, page.frame),
    ]


def _service_text(page: ServicePage, common: dict[str, str], *, single_file: bool) -> str:
    service, script = page.service, _asset("page.js")
    library = get_plotlyjs() if single_file else ""
    figures = _figures(page)
    return (
        _environment()
        .get_template("service.html.j2")
        .render(
            **common,
            service=service,
            facts=fact_list(service),
            month=newest(page.months).get("month"),
            readouts=readouts_of(page),
            counts=count_words(all_findings(page)),
            findings=findings_table(page, common["currency"]),
            months=months_tables(page.months, service, common["currency"]),
            periods=tables.periods_table(page.periods, service),
            gaps=tables.gaps_table(page.check),
            record=tables.record_words(page.check),
            notes=tables.notes_of(page.months),
            grades=[
                VOLTAGE_GRADES.get(service.angle_grade, service.angle_grade),
                CURRENT_GRADES.get(service.current_angle_grade, service.current_angle_grade),
                *([ASSUMED_SENSE] if service.sense_assumed else []),
            ],
            figures=figures,
            specs={
                f.key: _json({"traces": f.traces, "layout": f.layout, "linked": f.linked})
                for f in figures
                if not f.missing
            },
            palettes=_json({"light": LIGHT, "dark": DARK, "config": CONFIG}),
            styles=_styles(),
            script=Markup(script),  # our own file
            library=Markup(library),  # the chart library as it ships
            library_name=LIBRARY,
            policy=_allowed(script, *([library] if single_file else [])),
        )
    )


def _index_text(summaries: list[Summary], common: dict[str, str]) -> str:
    return (
        _environment()
        .get_template("index.html.j2")
        .render(
            **common,
            services=summaries,
            styles=_styles(),
            policy=_allowed().replace(" 'self'", " 'none'"),
        )
    )
