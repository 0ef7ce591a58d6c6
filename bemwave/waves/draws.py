"""Random numbers by index: the same seed and stratum give the same draw, whatever else is drawn.

The generator is Philox4x64-10 (Salmon et al. 2011, "Parallel random numbers: as easy as 1, 2,
3"), a fixed function of key and counter: seed and wave entry are the key, the stratum's index the
counter. Only its raw 64-bit integers are used, which numpy promises to keep (NEP 19), and they
are made into fractions here; so a draw does not depend on machine, version, band or order.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from bemwave.errors import InputError

Array = NDArray[np.float64]

_ORIGIN = 2**128  # counter of index 0, so that negative indices have their own too


def fractions_by_index(seed: int, first: int, count: int, stream: int = 0) -> Array:
    """Four independent fractions in [0, 1) for each of `count` consecutive indices.

    Parameters
    ----------
    seed : int
        0 .. 2^64 - 1.
    first : int
        First index, of either sign.
    count : int
        Number of indices.
    stream : int
        Tells apart seas of one seed: the number of the wave entry in its case.

    Returns
    -------
    array (count, 4)
        Multiples of 2^-53.
    """
    if not 0 <= seed < 2**64:
        raise InputError(f"the seed was given as {seed}; expected a whole number from 0 to 2^64-1")
    # numpy raises the counter before it draws, hence the one less
    generator = np.random.Philox(key=seed + (stream << 64), counter=_ORIGIN + first - 1)
    raw = generator.random_raw(4 * count).reshape(count, 4)
    return (raw >> np.uint64(11)).astype(np.float64) * 2.0**-53
