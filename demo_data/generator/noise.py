"""Repeatable noise: the same numbers on every machine and with every NumPy release.

NumPy promises stable raw bits of a bit generator, but not stable distributions; so
uniform and bell-shaped numbers are made here from the raw bits by exact arithmetic.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


class Noise:
    """A stream of repeatable random numbers.

    Parameters
    ----------
    seed : int
        The seed; one for each service.
    """

    def __init__(self, seed: int) -> None:
        self._bits = np.random.PCG64(seed)

    def uniform(self, count: int) -> Floats:
        """Return `count` numbers in [0, 1)."""
        raw = np.asarray(self._bits.random_raw(count), dtype=np.uint64)
        return np.asarray((raw >> np.uint64(11)) * 2.0**-53, dtype=np.float64)

    def bell(self, count: int) -> Floats:
        """Return `count` bell-shaped numbers: mean 0, deviation 1, never beyond ±6.

        Twelve uniform numbers are added: bounded, so that everyday operation cannot
        stray past a limit by chance.
        """
        return np.asarray(self.uniform(12 * count).reshape(12, count).sum(axis=0) - 6.0)

    def wander(self, count: int, memory: float) -> Floats:
        """Return a first-order drifting series: mean 0, deviation 1.

        Parameters
        ----------
        count : int
            Number of intervals.
        memory : float
            Correlation of one interval with the next, 0…1.
        """
        shocks = self.bell(count) * (1.0 - memory**2) ** 0.5
        drift = np.empty(count)
        level = 0.0
        for index, shock in enumerate(shocks.tolist()):
            level = memory * level + shock
            drift[index] = level
        return drift
