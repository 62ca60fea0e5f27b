"""What a column map must not say: checks of single keys and of keys against each other."""

from __future__ import annotations

import codecs
from collections.abc import Mapping, Set
from datetime import UTC, datetime
from encodings.aliases import aliases

from meterlens.settings.columns import VALUE_COLUMNS
from meterlens.settings.kinds import fault, nearest

__all__ = [
    "clock",
    "columns",
    "delimiter",
    "encoding",
    "numbers",
    "power_factor",
    "quality",
    "scale",
    "thousands",
    "timestamp_format",
]

_PF = {"pf_a", "pf_b", "pf_c", "pf_total"}
_ACTIVE = {
    "p_a_kw", "p_b_kw", "p_c_kw", "p_kw",
    "energy_kwh", "energy_export_kwh", "register_kwh", "register_export_kwh",
}  # fmt: skip
_REACTIVE = {
    "q_a_kvar", "q_b_kvar", "q_c_kvar", "q_kvar",
    "reactive_lagging_kvarh", "reactive_leading_kvarh",
    "register_lagging_kvarh", "register_leading_kvarh",
}  # fmt: skip
_APPARENT = {"s_a_kva", "s_b_kva", "s_c_kva", "s_kva"}
_LEAD_LAG = {"lead_lag_a", "lead_lag_b", "lead_lag_c", "lead_lag_total"}
_QUADRANT = {"quadrant_a", "quadrant_b", "quadrant_c", "quadrant_total"}
_VOLTAGE = {"v_a", "v_b", "v_c", "v_ab", "v_bc", "v_ca"}
_CURRENT = {"i_a", "i_b", "i_c"}

# An afternoon, and a day that is no valid month: what a format drops or mixes up, shows.
_PROBE = datetime(2031, 11, 23, 16, 45, tzinfo=UTC)
_HOURS = ("%H", "%I", "%X", "%c", "%T", "%R")


def timestamp_format(pattern: str | None) -> str | None:
    """Check that a strptime format brings back the instant that it prints."""
    if pattern is None or pattern == "epoch":
        return pattern
    if "%" not in pattern:
        raise fault(
            f'"{pattern}" is no strptime format',
            hint='For example "%d.%m.%Y %H:%M", or "epoch"; left out it is ISO 8601.',
        )
    try:
        read = datetime.strptime(_PROBE.strftime(pattern), pattern)
    except ValueError as error:
        raise fault(f'"{pattern}" is no strptime format: {error}') from None
    if read.date() != _PROBE.date():
        raise fault(
            f'"{pattern}" does not tell year, month and day',
            hint="Where date and time stand in two columns, name both in timestamp.",
        )
    if read.hour != _PROBE.hour and any(sign in pattern for sign in _HOURS):
        raise fault(
            f'"{pattern}" does not tell morning from afternoon',
            hint="Use %H for 24 hours, or %I with %p.",
        )
    return pattern


def encoding(name: str | None) -> str | None:
    """Check that an encoding is known."""
    if name is None:
        return None
    try:
        codecs.lookup(name)
        "".encode(name)
    except LookupError:
        known = {*aliases.values(), "utf-8", "latin-1", "windows-1252", "utf-16"}
        raise fault(f'"{name}" is no known encoding', hint=nearest(name, known)) from None
    return name


def delimiter(character: str | None) -> str | None:
    """Check that a delimiter cannot be part of a number or a quote."""
    if character is not None and (character.isalnum() or character in "\"'\r\n+-"):
        raise fault(f"{character!r} cannot separate fields", hint='Usual are "," ";" and "\\t".')
    return character


def thousands(character: str | None) -> str | None:
    """Check that a thousands mark cannot be part of the number itself."""
    if character is not None and (character.isalnum() or character in '"+-\r\n\t'):
        raise fault(f"{character!r} cannot group digits")
    return character


def numbers(decimal: str | None, grouping: str | None) -> None:
    """Check that the decimal mark and the thousands mark differ."""
    if decimal is not None and decimal == grouping:
        raise fault(f'"{grouping}" is the decimal mark already', key="thousands")


def columns(
    timestamp: tuple[str | int, ...],
    values: Mapping[str, str | int],
    texts: Mapping[str, str | int],
    header_row: int | None,
) -> None:
    """Check that columns are named the way the header allows, and number columns once."""
    if not values:
        raise fault("no column of readings is mapped", hint='Map at least one, as v_a = "…".')
    if len(set(timestamp)) != len(timestamp):
        raise fault("names the same column twice", key="timestamp")
    numbered = header_row == 0
    every = [("timestamp", name) for name in timestamp]
    every += [*values.items(), *texts.items()]
    for key, name in every:
        if numbered and isinstance(name, str):
            raise fault(
                f'"{name}" is a header, and header_row = 0 says that there is none',
                key=key,
                hint="Give the column's number, counted from 1.",
            )
        if not numbered and isinstance(name, int):
            raise fault(
                f"column {name} is a number, which needs header_row = 0",
                key=key,
                hint="Give the header in quotes.",
            )
    taken: dict[str | int, str] = dict.fromkeys(timestamp, "timestamp")
    for key, name in values.items():
        if name in taken:
            raise fault(f'column "{name}" is mapped already, as {taken[name]}', key=key)
        taken[name] = key


def scale(factors: Mapping[str, float], values: Mapping[str, str | int]) -> None:
    """Check that factors are of mapped number columns, and not zero."""
    for key, factor in factors.items():
        if key not in values:
            known = key in VALUE_COLUMNS
            raise fault(
                "no such column is mapped" if known else "is no column of readings",
                key=("scale", key),
                hint=nearest(key, values),
            )
        if factor == 0:
            raise fault("a factor of 0 erases every reading", key=("scale", key))


def clock(name: str, pattern: str | None) -> None:
    """Check that the clock and the timestamp format tell the same story."""
    if pattern is None:
        return
    if pattern == "epoch":
        if name != "utc":
            raise fault(
                "seconds since 1970 are UTC by definition", key="clock", hint='Write clock = "utc".'
            )
        return
    if name == "offset" and "%z" not in pattern:
        raise fault(
            'clock = "offset" needs a format that reads the offset',
            key="timestamp_format",
            hint="Add %z where the offset stands.",
        )
    if name != "offset" and "%z" in pattern:
        raise fault(
            "the format reads an offset (%z) that this clock would ignore",
            key="clock",
            hint='Write clock = "offset".',
        )


def quality(mapped: bool, estimated: tuple[str, ...]) -> None:
    """Check that a status column comes with the words that mean estimated."""
    if mapped and not estimated:
        raise fault(
            "a status column needs the values that mean estimated",
            key="estimated",
            hint='For example estimated = ["E"].',
        )
    if estimated and not mapped:
        raise fault("needs the status column", key="estimated", hint='Add quality = "…".')


def power_factor(
    convention: str | None,
    assume: str | None,
    lagging_sign: str | None,
    mapped: Set[str],
) -> None:
    """Check that the power factor convention is named and has the columns it needs."""
    has_pf = bool(_PF & mapped)
    has_power = bool((_ACTIVE | _REACTIVE | _APPARENT) & mapped)
    if convention is None and (has_pf or has_power):
        raise fault(
            "is required where a power factor or power column is mapped: nothing is guessed",
            key="pf_convention",
            hint="One of unsigned, sign-is-power-flow, sign-is-lead-lag, quadrant, suffix"
            + (", from-power." if has_power else "."),
        )
    _convention_fits(convention or "none", has_pf, has_power, mapped)
    if convention == "sign-is-lead-lag" and lagging_sign is None:
        raise fault(
            'is required with pf_convention = "sign-is-lead-lag"',
            key="lagging_sign",
            hint="Both are in use: does lagging import read negative or positive?",
        )
    if assume is None and _needs_assume(convention, mapped):
        raise fault(
            f'is required: with pf_convention = "{convention}" and these columns nothing '
            "tells lagging from leading",
            key="assume",
            hint='Write assume = "lagging" or "leading"; every result will carry it.',
        )


def _convention_fits(convention: str, has_pf: bool, has_power: bool, mapped: Set[str]) -> None:
    if convention == "none":
        if has_pf or has_power:
            raise fault(
                '"none" is for exports without power factor and power columns',
                key="pf_convention",
            )
        return
    if convention == "from-power":
        if has_pf:
            raise fault(
                '"from-power" is for exports without a power factor column',
                key="pf_convention",
                hint="Name the convention of the column, or leave the column out.",
            )
        if not _ACTIVE & mapped:
            raise fault('"from-power" needs a kW or kWh column', key="pf_convention")
        return
    if not has_pf:
        raise fault(
            f'"{convention}" needs a power factor column (pf_a …, or pf_total)',
            key="pf_convention",
        )
    if convention == "quadrant" and not _QUADRANT & mapped:
        raise fault('"quadrant" needs a quadrant column (quadrant_a …)', key="pf_convention")


def _needs_assume(convention: str | None, mapped: Set[str]) -> bool:
    if (_REACTIVE | _LEAD_LAG | _QUADRANT) & mapped:
        return False  # a kvar column's sign always wins
    if convention == "unsigned":
        return True
    if convention == "from-power":
        # kW alone gives no kvar at all; with kVA, or V and I, its size but not its sign.
        return bool(_APPARENT & mapped or (_VOLTAGE & mapped and _CURRENT & mapped))
    return convention == "sign-is-power-flow"
