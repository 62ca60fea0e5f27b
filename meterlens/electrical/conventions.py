"""Signs, angles and what "not known" means.

Load convention: P > 0 is consumed, Q > 0 is lagging (inductive), S = P + jQ = V·I*.
The words *lagging* and *leading* follow the sign of P·Q. An exported power factor is a
magnitude and, by one of several conventions, a sign; :func:`read_power_factor` is the one
place that turns it into a magnitude, a direction of power and a lead/lag sense.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntFlag

import numpy as np
import numpy.typing as npt

__all__ = [
    "FORMULA_EDITION",
    "PF_CLAMP_BOUND",
    "BoolArray",
    "ComplexArray",
    "Flag",
    "FloatArray",
    "PowerFactorReading",
    "PowerFactorSense",
    "phase_rotation",
    "read_power_factor",
]

FloatArray = npt.NDArray[np.float64]
ComplexArray = npt.NDArray[np.complex128]
BoolArray = npt.NDArray[np.bool_]

#: Changes whenever a formula changes its results; derived rows of another edition are stale.
FORMULA_EDITION = "1"

#: A printed |PF| above 1 by no more than this share is rounding in the meter and is clamped.
PF_CLAMP_BOUND = 1.005


class Flag(IntFlag):
    """What an interval's derived values lean on; the store shows the words.

    The word of a flag is its name in lower case with hyphens (``light-load``).
    """

    LIGHT_LOAD = 1
    NO_LOAD = 2
    PF_CLAMPED = 4
    LEAD_LAG_ASSUMED = 8
    Q_UNKNOWN = 16
    POWER_MISMATCH = 32
    SIGN_UNEXPECTED = 64
    INCOMPLETE = 128
    Q_FROM_VOLT_AMPERES = 256
    LIGHT_PHASE = 512
    ANGLES_DO_NOT_CLOSE = 1024


@dataclass(frozen=True)
class PowerFactorSense:
    """How an export's power factor column is to be read.

    Attributes
    ----------
    convention : str
        ``unsigned``, ``sign-is-power-flow``, ``sign-is-lead-lag``, ``from-power`` or ``none``.
    assumed : int
        +1 lagging, -1 leading, 0 not stated: the sense taken where nothing tells it.
    lagging_sign : int
        With ``sign-is-lead-lag``: -1 where a negative number means lagging, else +1.
    per_unit : float
        What the column prints for unity: 1 for fractions, 100 for percent.
    """

    convention: str
    assumed: int = 0
    lagging_sign: int = -1
    per_unit: float = 1.0


@dataclass(frozen=True)
class PowerFactorReading:
    """A printed power factor, taken apart.

    Attributes
    ----------
    magnitude : FloatArray
        |PF|, 0 to 1; NaN where not printed.
    direction : FloatArray
        +1 import, -1 export.
    sense : FloatArray
        +1 lagging, -1 leading, NaN where the printed value does not tell and no
        assumption applies.
    flags : ndarray of uint16
        Bits of :class:`Flag`.
    assumed : BoolArray
        True where the sense is an assumption.
    """

    magnitude: FloatArray
    direction: FloatArray
    sense: FloatArray
    flags: npt.NDArray[np.uint16]
    assumed: BoolArray


def phase_rotation(sequence: str) -> ComplexArray:
    """Unit phasors of phases a, b, c at nominal angles.

    Parameters
    ----------
    sequence : str
        ``abc`` (b lags a by 120°) or ``acb`` (b leads a by 120°).

    Returns
    -------
    ComplexArray
        Shape (3, 1), dimensionless: 1, 1∠∓120°, 1∠±120°.

    Raises
    ------
    ValueError
        For any other sequence.

    Notes
    -----
    Written with exact halves and √3/2, not through cos and sin, so that a balanced set
    sums to zero to the last bit.
    """
    if sequence not in ("abc", "acb"):
        raise ValueError(f"phase sequence {sequence!r} is neither 'abc' nor 'acb'")
    half, root = -0.5, np.sqrt(3.0) / 2.0
    sign = -1.0 if sequence == "abc" else 1.0
    return np.array([[1.0], [complex(half, sign * root)], [complex(half, -sign * root)]])


def read_power_factor(
    printed: FloatArray,
    rule: PowerFactorSense,
    metered_p: FloatArray | None = None,
    lead_lag: FloatArray | None = None,
    metered_q: FloatArray | None = None,
) -> PowerFactorReading:
    """Magnitude, direction and lead/lag sense of a printed power factor.

    Parameters
    ----------
    printed : FloatArray
        Shape (3, n), or (n,) of a total: the numbers as printed, sign and percent
        included; NaN where none is.
    rule : PowerFactorSense
        The convention of this export.
    metered_p : FloatArray, optional
        Shape (3, n), W: metered active power; its sign is the direction.
    lead_lag : FloatArray, optional
        Shape (3, n): +1 lagging, -1 leading as printed in a column of its own; NaN where
        it says nothing.
    metered_q : FloatArray, optional
        Shape (3, n), var: metered total reactive power, whose sign goes before an
        assumption.

    Returns
    -------
    PowerFactorReading
        All arrays of the shape of `printed`.

    Notes
    -----
    ``unsigned``: import; the assumed sense; a negative number is flagged
    (``sign-unexpected``), its magnitude kept. ``sign-is-power-flow``: the sign is that of
    P. ``sign-is-lead-lag``: the sign bit decides, so "-0.00" of a pure reactor keeps its
    sense. An assumption holds at import only, since one about a load says nothing of a
    generator: at export the sense is then NaN and Q stays unknown. |PF| above 1 is taken
    as 1 and flagged; the reader has blanked what lies above `PF_CLAMP_BOUND`.
    """
    scaled = printed / rule.per_unit
    magnitude = np.abs(scaled)
    flags = np.where(magnitude > 1.0, np.uint16(Flag.PF_CLAMPED), np.uint16(0))
    magnitude = np.minimum(magnitude, 1.0)
    negative = np.signbit(scaled) & ~np.isnan(scaled)
    direction = np.ones_like(scaled)
    if rule.convention == "sign-is-power-flow":
        direction[negative & (scaled != 0)] = -1.0
    elif rule.convention != "sign-is-lead-lag":
        flags |= np.where(scaled < 0, np.uint16(Flag.SIGN_UNEXPECTED), np.uint16(0))
    if metered_p is not None:
        direction = np.where(np.isnan(metered_p), direction, np.where(metered_p < 0, -1.0, 1.0))
    sense = np.full(scaled.shape, np.nan)
    if lead_lag is not None:
        sense = lead_lag.copy()
    if rule.convention == "sign-is-lead-lag":
        by_sign = np.where(negative == (rule.lagging_sign < 0), 1.0, -1.0)
        sense = np.where(np.isnan(sense) & ~np.isnan(scaled), by_sign, sense)
    if metered_q is not None:
        by_total = np.where(metered_q == 0, np.nan, np.sign(metered_q) * direction)
        sense = np.where(np.isnan(sense), by_total, sense)
    assumed = np.isnan(sense) & (direction > 0)
    if rule.assumed:
        sense = np.where(assumed, float(rule.assumed), sense)
    assumed &= rule.assumed != 0
    return PowerFactorReading(magnitude, direction, sense, flags, assumed)
