"""Many plane waves summed at the vertices of a sheet, by non-uniform FFT.

On a rectangle of squares the sum over components at any wavenumbers is one transform of type 1,
elsewhere one of type 3 (Barnett, Magland & af Klinteberg 2019, SIAM J. Sci. Comput. 41:C479). It
is the closed form to 1e-9 of the sum of amplitudes: nothing repeats, as it would on a grid of
wavenumbers.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from bemwave.frames.sheet import Array, Sheet
from bemwave.waves import Sea

Complex = NDArray[np.complex128]

ACCURACY = 1e-9


class WaveSum:
    """A sea at a sheet's vertices: elevation and what goes with it.

    Parameters
    ----------
    sea : Sea
    sheet : Sheet
    shifted : bool
        Whether the water's horizontal displacement is wanted too.
    """

    def __init__(self, sea: Sea, sheet: Sheet, shifted: bool) -> None:
        import finufft

        squares = sheet.squares
        self._sea, self._rows = sea, None if squares is None else squares.rows
        self._weights = _weights(sea, shifted)
        k = (sea.wavenumber * np.cos(sea.heading), sea.wavenumber * np.sin(sea.heading))
        # one thread: the same sum, bit by bit, whatever the machine
        common = {"n_trans": len(self._weights), "eps": ACCURACY, "isign": 1, "nthreads": 1}
        if squares is None:
            self._start = np.exp(1j * sea.phase)
            self._plan = finufft.Plan(3, 2, **common)
            self._plan.setpts(*k, None, *np.ascontiguousarray(sheet.mesh.points[:, :2].T))
        else:
            (x, y), (dx, dy), count = squares.corner, squares.step, squares.count
            # the transform counts from the middle of the rectangle
            middle = k[0] * (x + dx * (count[0] // 2)) + k[1] * (y + dy * (count[1] // 2))
            self._start = np.exp(1j * (sea.phase + middle))
            self._plan = finufft.Plan(1, count, **common)
            turn = 2.0 * math.pi
            self._plan.setpts(np.remainder(k[0] * dx, turn), np.remainder(k[1] * dy, turn))

    def at(self, time: float) -> Array:
        """At a time [s], the rows of `_weights`: (5 or 7, n)."""
        turned = self._start * np.exp(-1j * self._sea.frequency * time)
        found: Complex = self._plan.execute(np.ascontiguousarray(self._weights * turned))
        if self._rows is None:
            return np.asarray(found.real)
        # the transform has x first
        return np.asarray(found.real.transpose(0, 2, 1).reshape(len(found), -1)[:, self._rows])


def _weights(sea: Sea, shifted: bool) -> Complex:
    """What each row takes of a component amplitude exp(i(k.x - w t + phase)), (rows, components).

    Elevation m, velocity u, v, w at z = 0 m/s, second rate of the elevation m/s^2, and the
    horizontal displacement, i (k/|k|) coth(kh) times the elevation: its rate is u, v.
    """
    w, east, north = sea.frequency, np.cos(sea.heading), np.sin(sea.heading)
    coth = 1.0 / np.tanh(sea.wavenumber * sea.depth)
    rows = [np.ones(sea.count), w * coth * east, w * coth * north, -1j * w, -(w**2)]
    if shifted:
        rows += [1j * coth * east, 1j * coth * north]
    return np.asarray(sea.amplitude * np.array(rows, dtype=np.complex128))
