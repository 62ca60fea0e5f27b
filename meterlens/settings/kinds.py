"""Building blocks of the settings models: strict scalars, fixed words, and how a check fails.

TOML already tells numbers from text, so a number in quotes is a slip and not a
spelling of the number: every scalar here is strict.
"""

from __future__ import annotations

from difflib import get_close_matches
from typing import TYPE_CHECKING, Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field, Strict, StringConstraints
from pydantic_core import PydanticCustomError

if TYPE_CHECKING:
    from collections.abc import Iterable

__all__ = [
    "Fraction",
    "Identifier",
    "NotNegative",
    "Number",
    "Phase",
    "Positive",
    "Settings",
    "Text",
    "TrueFalse",
    "WholeNumber",
    "fault",
    "nearest",
]

Number = Annotated[float, Strict(), Field(allow_inf_nan=False)]
Positive = Annotated[float, Strict(), Field(allow_inf_nan=False, gt=0)]
NotNegative = Annotated[float, Strict(), Field(allow_inf_nan=False, ge=0)]
Fraction = Annotated[float, Strict(), Field(allow_inf_nan=False, ge=0, le=1)]
WholeNumber = Annotated[int, Strict(), Field(ge=0)]
TrueFalse = Annotated[bool, Strict()]
Text = Annotated[str, StringConstraints(min_length=1)]
Identifier = Annotated[str, StringConstraints(pattern=r"^[a-z0-9-]+$")]
Phase = Literal["a", "b", "c"]


class Settings(BaseModel):
    """Base of every settings table: unchangeable, and no key that is not known."""

    model_config = ConfigDict(frozen=True, extra="forbid")


def fault(
    reason: str, *, key: str | tuple[str | int, ...] = (), hint: str | None = None
) -> PydanticCustomError:
    """Make the error of a check that looks at more than one key.

    Parameters
    ----------
    reason : str
        What is wrong, as one sentence.
    key : str or tuple of str or int
        The key at fault, below the table that is being checked; empty for the
        value itself.
    hint : str, optional
        What to do next.

    Returns
    -------
    PydanticCustomError
        To be raised inside a validator.
    """
    path = (key,) if isinstance(key, str) else key
    return PydanticCustomError(
        "settings", "{reason}", {"reason": reason, "path": path, "hint": hint}
    )


def nearest(word: str, known: Iterable[str], *, count: int = 3) -> str | None:
    """Offer the known words that look like a wrong one, as a sentence.

    Parameters
    ----------
    word : str
        What was written.
    known : iterable of str
        What could have been meant.
    count : int
        How many to offer at most.

    Returns
    -------
    str or None
        ``Did you mean "…"?``, or None where nothing is near.
    """
    spelled = {candidate.lower(): candidate for candidate in known}
    found = get_close_matches(word.lower(), spelled, n=count, cutoff=0.6)
    if not found:
        return None
    return "Did you mean " + " or ".join(f'"{spelled[match]}"' for match in found) + "?"
