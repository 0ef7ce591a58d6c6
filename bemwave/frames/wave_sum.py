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
        once = sea.wavenumber * np.array([np.cos(sea.heading), np.sin(sea.heading)])
        k = np.hstack([once, -once])  # see `at`
        # one thread: the same sum, bit by bit, whatever the machine
        pairs = (len(self._weights) + 1) // 2
        common = {"n_trans": pairs, "eps": ACCURACY, "isign": 1, "nthreads": 1}
        if squares is None:
            self._start = np.exp(1j * sea.phase)
            self._plan = finufft.Plan(3, 2, **common)
            self._plan.setpts(*k, None, *np.ascontiguousarray(sheet.mesh.points[:, :2].T))
        else:
            (x, y), (dx, dy), count = squares.corner, squares.step, squares.count
            # the transform counts from the middle of the rectangle
            middle = once[0] * (x + dx * (count[0] // 2)) + once[1] * (y + dy * (count[1] // 2))
            self._start = np.exp(1j * (sea.phase + middle))
            self._plan = finufft.Plan(1, count, **common)
            turn = 2.0 * math.pi
            self._plan.setpts(np.remainder(k[0] * dx, turn), np.remainder(k[1] * dy, turn))

    def at(self, time: float) -> Array:
        """At a time [s], the rows of `_weights`: (5 or 7, n).

        Two real rows are the real and the imaginary part of one transform, in which each wave
        stands with its conjugate at minus its wavenumber.
        """
        turned = self._weights * (self._start * np.exp(-1j * self._sea.frequency * time))
        first, second = turned[0::2], np.zeros_like(turned[0::2])
        second[: len(turned) // 2] = turned[1::2]
        both = [first + 1j * second, first.conj() + 1j * second.conj()]
        found: Complex = self._plan.execute(np.ascontiguousarray(0.5 * np.hstack(both)))
        if self._rows is not None:  # the transform has x first
            found = found.transpose(0, 2, 1).reshape(len(found), -1)[:, self._rows]
        split = np.stack([found.real, found.imag], axis=1).reshape(2 * len(found), -1)
        return np.asarray(split[: len(turned)])


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
