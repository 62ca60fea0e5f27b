"""Numbers, times and terms as people read them."""

from __future__ import annotations

import html
import math
from datetime import datetime
from typing import Any, Final

__all__ = [
    "ASSUMED_SENSE",
    "CONNECTIONS",
    "CURRENT_GRADES",
    "PERIOD_KINDS",
    "UNKNOWN",
    "VOLTAGE_GRADES",
    "date_of",
    "kind_words",
    "local_ms",
    "minutes_words",
    "number",
    "percent",
    "plain",
    "quantity",
    "sense_words",
    "share",
    "size_words",
    "small_percent",
    "wall_clock",
    "when",
]

UNKNOWN: Final = "–"
_TIE: Final = "\u00a0"  # no-break space: a number stays with its unit

CONNECTIONS: Final[dict[str, str]] = {
    "wye-4w": "wye, four wires",
    "delta-3w": "delta, three wires",
    "delta-4w": "delta with a high leg, four wires",
}

VOLTAGE_GRADES: Final[dict[str, str]] = {
    "measured": "Voltage angles are measured, or follow from line-to-neutral and "
    "line-to-line voltages together (grade: measured).",
    "triangle": "Voltage angles follow from the closed triangle of the three line-to-line "
    "voltages (grade: triangle).",
    "nominal": "Voltage angles were not metered and are taken as nominal, so negative-sequence "
    "figures are estimates (grade: nominal).",
}

CURRENT_GRADES: Final[dict[str, str]] = {
    "per-phase": "Current angles come from each phase’s own power factor (grade: per-phase).",
    "shared": "One power factor is applied to all three currents (grade: shared).",
    "equal": "No power factor was metered: the currents are taken 120° apart (grade: equal).",
}

_POWER_FACTORS: Final = {"low-pf", "leading"}
_FINE_SHARES: Final = {"voltage-imbalance", "incomplete-month"}
_COUNTED: Final = {"rows", "values", "intervals"}

ASSUMED_SENSE: Final = (
    "The exports do not say whether the load lags or leads: the sign is an assumption of the "
    "column map, so a load of the other kind cannot be seen here."
)

PERIOD_KINDS: Final[dict[str, str]] = {
    "low-pf": "Power factor below target",
    "leading": "Leading",
    "current-imbalance": "Current imbalance",
    "voltage-imbalance": "Voltage imbalance",
    "voltage": "Voltage outside its band",
    "overload": "Current above rating",
}


def number(value: Any, digits: int | None = None) -> str:
    """Write a number with a comma every three digits; unknown as a dash.

    Parameters
    ----------
    value : float or None
        Any number.
    digits : int, optional
        Decimals; left out, as many as three significant figures need.
    """
    if value is None or not math.isfinite(float(value)):
        return UNKNOWN
    amount = float(value)
    if digits is None:
        size = 0 if amount == 0 else math.floor(math.log10(abs(amount)))
        digits = max(0, min(4, 2 - size))
    text = f"{amount:,.{digits}f}"
    # A rounded nothing is written without its sign.
    return text.lstrip("-") if float(f"{amount:.{digits}f}") == 0 else text.replace("-", "−")


def percent(value: Any, digits: int = 1) -> str:
    """Write a fraction as per cent; unknown as a dash."""
    if value is None or not math.isfinite(float(value)):
        return UNKNOWN
    return f"{number(float(value) * 100, digits)}%"


def share(value: Any, digits: int = 2) -> str:
    """Write how complete something is: only what is exactly complete says 100%."""
    if value is None or not math.isfinite(float(value)):
        return UNKNOWN
    part = float(value)
    if part >= 1 - 1e-9:  # sums of minutes may end a hair's breadth below 1
        return "100%"
    scale = 10**digits
    return percent(min(part, (100 - 1 / scale) / 100), digits)


def small_percent(value: float) -> str:
    """Write a share above nothing that may be tiny, never as 0.0%."""
    return "less than 0.1%" if 0 < value < 0.001 else percent(value)


def quantity(value: Any, unit: str, digits: int | None = None) -> str:
    """Write a number and its unit so that they stay on one line; unknown as a dash."""
    text = number(value, digits)
    return text if text == UNKNOWN else f"{text}{_TIE}{unit}"


def size_words(kind: Any, value: Any, unit: Any) -> str:
    """Write the size of a finding or period in the manner of its sentence.

    Power factors keep three decimals, other fractions become per cent, voltages per unit
    keep three decimals, and what is counted is whole.
    """
    if value is None:
        return UNKNOWN
    if kind in _POWER_FACTORS:
        return number(value, 3)
    if unit in ("fraction", "", None):
        return percent(value, 2 if kind in _FINE_SHARES else 1)
    if unit == "pu":
        return quantity(value, "pu", 3)
    if unit in _COUNTED:
        return quantity(value, unit.removesuffix("s") if value == 1 else unit, 0)
    return quantity(value, str(unit))


def sense_words(hours: Any, *, assumed: bool) -> str:
    """Write the hours of leading load; an assumption is never stated as a measurement."""
    if not assumed:
        return quantity(hours, "h", 1)
    return f"{quantity(hours, 'h', 1)}, by assumption" if hours else "not measured"


def plain(text: Any) -> str:
    """Escape a name for chart text, which reads a little markup."""
    return html.escape(str(text), quote=False)


def wall_clock(value: Any) -> datetime | None:
    """Read a site-local time (ISO 8601 text or datetime) as wall clock without offset."""
    if isinstance(value, str):
        try:
            value = datetime.fromisoformat(value)
        except ValueError:
            return None
    return value.replace(tzinfo=None) if isinstance(value, datetime) else None


def local_ms(value: Any) -> float:
    """Return a local time as milliseconds on the charts' axis; NaN where unknown."""
    moment = wall_clock(value)
    if moment is None:
        return math.nan
    return (moment - datetime(1970, 1, 1)).total_seconds() * 1000.0


def when(value: Any) -> str:
    """Write a local time to the minute; unknown as a dash."""
    moment = wall_clock(value)
    return UNKNOWN if moment is None else moment.strftime("%Y-%m-%d %H:%M")


def date_of(value: Any) -> str:
    """Write a local date; unknown as a dash."""
    moment = wall_clock(value)
    return UNKNOWN if moment is None else moment.strftime("%Y-%m-%d")


def minutes_words(minutes: float) -> str:
    """Write a length of time: ``15 minutes``, ``1 hour``, ``2 hours``."""
    if minutes >= 60 and minutes % 60 == 0:
        amount, unit = minutes / 60, "hour"
    elif minutes < 1:
        amount, unit = minutes * 60, "second"
    else:
        amount, unit = minutes, "minute"
    return f"{amount:g} {unit}" + ("" if amount == 1 else "s")


def kind_words(kind: Any) -> str:
    """Turn a result's kind (``low-pf``) into words for a heading or a cell."""
    text = str(kind)
    return PERIOD_KINDS.get(text, text.replace("-", " ").capitalize())
