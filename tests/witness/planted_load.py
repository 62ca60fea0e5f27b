"""Phasors planted by hand-made integer patterns, and the text of an export that prints them.

Magnitudes are whole numbers of the last printed digit (decivolt, centiampere, hundredths of
a percent), so the printed text is exact and the phasors are known without reading it back.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from pathlib import Path
from zoneinfo import ZoneInfo

from plain_power import NOMINAL_RAD, Service
from plain_reader import PHASES, ExportMap

Triple = tuple[int, int, int]
WORDS = {True: "lead", False: "lag"}


@dataclass(frozen=True)
class Planted:
    """One interval as it truly was; `pf_blank` marks phases whose PF cell stays empty."""

    start: datetime
    v_dv: Triple
    i_ca: Triple
    pf_bp: Triple
    leading: tuple[bool, bool, bool] = (False, False, False)
    exporting: bool = False
    pf_blank: tuple[bool, bool, bool] = (False, False, False)

    def power_kva(self) -> list[complex]:
        """S = V·I* of the three phases, from phasors (kVA)."""
        out = []
        for k in range(3):
            phi = math.acos(min(1.0, self.pf_bp[k] / 10000.0)) * (-1.0 if self.leading[k] else 1.0)
            if self.exporting:
                phi += math.pi
            volt = cmath.rect(self.v_dv[k] / 10.0, NOMINAL_RAD[k])
            amp = cmath.rect(self.i_ca[k] / 100.0, NOMINAL_RAD[k] - phi)
            out.append(volt * amp.conjugate() / 1000.0)
        return out


@dataclass
class Line:
    """A line of the body, and what it is meant to be worth (None: not a row at all)."""

    text: str
    outcome: str | None = "stored"
    impossible: tuple[str, ...] = ()
    start: datetime | None = None


@dataclass
class Export:
    """A written site: where it is, how its file reads, and what was planted."""

    folder: Path
    file: Path
    export_map: ExportMap
    service: Service
    truth: dict[datetime, Planted] = field(default_factory=dict)
    planted: dict[int, Line] = field(default_factory=dict)
    loose: set[datetime] = field(default_factory=set)


def local_start(zone: str, day: str, clock: str, fold: int = 0) -> datetime:
    """The naive UTC instant of a site-local date and time."""
    wall = datetime.fromisoformat(f"{day}T{clock}:00").replace(tzinfo=ZoneInfo(zone), fold=fold)
    return wall.astimezone(UTC).replace(tzinfo=None)


def run_of(first: datetime, after: datetime, interval_min: int = 15) -> list[datetime]:
    """Every interval start from `first` up to, not including, `after` (UTC)."""
    step = timedelta(minutes=interval_min)
    return [first + n * step for n in range((after - first) // step)]


def decimal_text(value: int, places: int, export_map: ExportMap) -> str:
    """A whole number of last digits as the meter prints it."""
    whole, rest = divmod(abs(value), 10**places)
    text = f"{whole:,}".replace(",", export_map.thousands)
    if places:
        text += f"{export_map.decimal}{rest:0{places}d}"
    return ("-" if value < 0 else "") + text


def pf_text(planted: Planted, k: int, export_map: ExportMap) -> str:
    """The PF cell of one phase in the export's convention."""
    if planted.pf_blank[k]:
        return ""
    size = planted.pf_bp[k]
    convention = export_map.pf_convention
    if convention == "sign-is-lead-lag":
        negative_leads = export_map.lagging_sign != "negative"
        size = -size if planted.leading[k] == negative_leads else size
    if convention == "sign-is-power-flow" and planted.exporting:
        size = -size
    text = decimal_text(size, 2 if export_map.pf_percent else 4, export_map)
    return f"{text} {WORDS[planted.leading[k]]}" if convention == "suffix" else text


def stamp_texts(start: datetime, export_map: ExportMap) -> list[str]:
    """The stamp of an interval, in one cell or two."""
    length = timedelta(minutes=export_map.interval_min)
    instant = start + (length if export_map.stamp == "end" else timedelta(0))
    if export_map.clock == "local":
        zone = ZoneInfo(export_map.zone)
        instant = instant.replace(tzinfo=UTC).astimezone(zone).replace(tzinfo=None)
    if not export_map.stamp_format:
        return [instant.isoformat(timespec="seconds")]
    if [key for key, _, _ in export_map.columns].count("timestamp") == 1:
        return [instant.strftime(export_map.stamp_format)]
    if instant.hour == instant.minute == 0 and export_map.stamp == "end":
        return [(instant - timedelta(days=1)).strftime("%Y-%m-%d"), "24:00"]
    return [instant.strftime("%Y-%m-%d"), instant.strftime("%H:%M")]


def cells_of(planted: Planted, export_map: ExportMap) -> list[str]:
    """The cells of a row, in the file's order."""
    stamps = iter(stamp_texts(planted.start, export_map))
    out = []
    for key, _, _ in export_map.columns:
        k = PHASES.index(key[-1]) if key[-2:] in ("_a", "_b", "_c") else 0
        if key == "timestamp":
            out.append(next(stamps))
        elif key.startswith("v_"):
            out.append(decimal_text(planted.v_dv[k], 1, export_map))
        elif key == "i_n":
            out.append(decimal_text(min(planted.i_ca) // 3 + 7, 2, export_map))
        elif key.startswith("i_"):
            out.append(
                decimal_text(planted.i_ca[k], 5 if key in export_map.scale else 2, export_map)
            )
        elif key.startswith("pf_"):
            out.append(pf_text(planted, k, export_map))
        elif key.startswith("lead_lag"):
            out.append(WORDS[planted.leading[k]])
        else:
            out.append("OK" if key == "quality" else "21")
    return out


def body_of(
    truth: dict[datetime, Planted],
    export_map: ExportMap,
    change: Callable[[datetime, list[str]], None] | None = None,
) -> dict[datetime, Line]:
    """One good line for each interval, in time order."""
    lines = {}
    for start, planted in truth.items():
        cells = cells_of(planted, export_map)
        if change is not None:
            change(start, cells)
        lines[start] = Line(export_map.delimiter.join(cells), start=start)
    return lines


def write_site(
    folder: Path, export: Export, head: list[str], body: list[Line], toml: str, newline: str = "\n"
) -> Export:
    """Write the export and its site file, and note each line's number.

    Parameters
    ----------
    folder : Path
        An empty folder that becomes the site.
    export : Export
        What is written; its `planted` is filled here.
    head : list of str
        Everything before the first row: preamble, header, units.
    body : list of Line
        The rows in file order.
    toml : str
        The text of ``site.toml``.
    newline : str
        The file's line ending.
    """
    texts = head + [line.text for line in body]
    for number, line in enumerate(body, start=len(head) + 1):
        export.planted[number] = line
    export.file.parent.mkdir(parents=True, exist_ok=True)
    raw = newline.join(texts) + newline
    export.file.write_bytes(raw.encode(export.export_map.encoding))
    (folder / "site.toml").write_text(toml, encoding="utf-8")
    return export


def site_toml(
    export_map: ExportMap, service: Service, *, declared: bool = True, extra: str = ""
) -> str:
    """The ``site.toml`` that says all of this to the program.

    With `declared` false the keys that can be inferred are left out.
    """
    stamps = [header for key, header, _ in export_map.columns if key == "timestamp"]
    lines = ["[site]", 'name = "Witness works"', f'timezone = "{export_map.zone}"', ""]
    lines += ["[[service]]", 'id = "main"', 'name = "Main switchboard"', 'connection = "wye-4w"']
    lines += [
        f"nominal_voltage_v = {service.nominal_voltage_v}",
        f"rating_a = {service.rating_a}",
        f"light_load_fraction = {service.light_load_fraction}",
        f"target_pf = {service.target_pf}",
        f"voltage_band_pu = [{service.voltage_band_pu[0]}, {service.voltage_band_pu[1]}]",
        f"demand_window_min = {service.demand_window_min}",
        f'demand_kind = "{service.demand_kind}"',
        'files = ["exports/*"]',
        "",
        "[service.columns]",
        f"timestamp = {_toml_list(stamps) if len(stamps) > 1 else _toml_text(stamps[0])}",
        f'clock = "{export_map.clock}"',
        f'stamp = "{export_map.stamp}"',
        f'pf_convention = "{export_map.pf_convention}"',
        f'pf_unit = "{"percent" if export_map.pf_percent else "fraction"}"',
        f'assume = "{export_map.assume}"',
    ]
    if export_map.stamp_format:
        lines.append(f'timestamp_format = "{export_map.stamp_format}"')
    if export_map.pf_convention == "sign-is-lead-lag":
        lines.append(f'lagging_sign = "{export_map.lagging_sign}"')
    for key, header, _ in export_map.columns:
        if key not in ("", "timestamp"):
            lines.append(f"{key} = {_toml_text(header)}")
    lines.append(f"missing = {_toml_list(list(export_map.missing))}")
    if export_map.scale:
        pairs = ", ".join(f"{key} = {value}" for key, value in export_map.scale.items())
        lines.append(f"scale = {{ {pairs} }}")
    if declared:
        lines += _declared_lines(export_map)
    return "\n".join(lines) + "\n" + extra


def _declared_lines(export_map: ExportMap) -> list[str]:
    lines = [
        f"interval_min = {export_map.interval_min}",
        f"delimiter = {_toml_text(export_map.delimiter)}",
        f'decimal = "{export_map.decimal}"',
        f'encoding = "{export_map.encoding}"',
        f"header_row = {export_map.header_row}",
        f"units_row = {str(export_map.units_row).lower()}",
    ]
    if export_map.thousands:
        lines.append(f'thousands = "{export_map.thousands}"')
    return lines


def _toml_text(text: str) -> str:
    return '"' + text.replace("\t", "\\t") + '"'


def _toml_list(texts: list[str]) -> str:
    return "[" + ", ".join(_toml_text(text) for text in texts) + "]"
