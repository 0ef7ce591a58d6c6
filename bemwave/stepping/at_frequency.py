"""Route "grid" at one frequency: the same flow map, solved for steady waves instead of stepped.

All that varies goes with exp(-i w t): the real part of complex amplitudes times that. With the
elevation damped at a rate nu (`stepping.absorber`) the two conditions at the surface,
eta_t = A phi + A_q - nu eta and phi_t = -g eta, make

    (g A - w^2 - i w nu) phi = -g A_q,

A_q being the vertical velocity that the hulls' given flux makes under a surface of no potential.
It is solved by GMRES (Saad & Schultz 1986, SIAM J. Sci. Stat. Comput. 7:856), the equation divided
by that of an open sea which damps everywhere, g k tanh(kh) - (1 + .3i) w^2 in Fourier space.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import fft
from scipy.sparse.linalg import LinearOperator, gmres

from bemwave.errors import RunError
from bemwave.flow.grid import GridFlow

Array = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]

DAMPED = 0.3  # of w^2: what the sea that divides loses
ACCURACY = 1e-6  # of the equation, over its right-hand side
WORST = 1e-5  # above this there is no result
BASIS = 60  # fields kept by an iteration until it starts again
CYCLES = 5


class AtFrequency:
    """Waves of one frequency that hulls make on a grid.

    Parameters
    ----------
    flow : the flow map.
    gravity : m/s^2.
    frequency : rad/s.
    damping : (nx ny,) rate nu at the nodes [1/s].
    """

    def __init__(self, flow: GridFlow, gravity: float, frequency: float, damping: Array) -> None:
        self._flow, self._gravity, self._frequency = flow, gravity, frequency
        self._water = np.flatnonzero(~flow.continuation.inside)
        self._shift = frequency * (frequency + 1j * damping[self._water])
        (nx, ny), d = flow.sheet.shape, flow.sheet.spacing
        k = np.hypot(fft.fftfreq(nx, d)[:, None], fft.fftfreq(ny, d)[None, :]) * 2.0 * math.pi
        rise = k * np.tanh(k * min(flow.sheet.depth, 1e6 * nx * d))  # 0 inf is nan
        self._sea = 1.0 / (gravity * rise - (1.0 + DAMPED * 1j) * frequency**2)

    def solve(self, hull_flux: Complex) -> tuple[Complex, Complex]:
        """Potentials at the surface's nodes (nx ny, k) and the hulls' (nodes, k) [m^2/s].

        Parameters
        ----------
        hull_flux : (panels, k) velocity along normals out of the water [m/s].

        Raises
        ------
        RunError
            If the iterations do not converge.
        """
        potential = np.stack([self._one(column) for column in hull_flux.T], axis=1)
        at_hull = self._flow.hull_potential(_parts(potential), _parts(hull_flux))
        return potential, _whole(at_hull)

    def elevation(self, potential: Complex) -> Complex:
        """Elevation that goes with a potential at the surface [m]."""
        return np.asarray(1j * self._frequency / self._gravity * potential)

    def _one(self, hull_flux: Complex) -> Complex:
        """(nx ny,) the continued potential of one flux (panels,)."""
        still = np.zeros((self._flow.sheet.size, 2))
        made = self._flow.surface_flux(still, _parts(hull_flux[:, None]))
        wanted = -self._gravity * _whole(made)[self._water, 0]
        count = len(self._water)
        if not np.linalg.norm(wanted):
            return np.zeros(len(still), dtype=complex)
        # its types know no complex numbers
        equation: Any = LinearOperator((count, count), matvec=self._left_side, dtype=complex)
        division: Any = LinearOperator((count, count), matvec=self._divide, dtype=complex)
        solved: Any = gmres(
            equation, wanted, M=division, rtol=ACCURACY, restart=BASIS, maxiter=CYCLES
        )
        found: Complex = solved[0]
        left = np.linalg.norm(wanted - self._left_side(found)) / np.linalg.norm(wanted)
        if not left <= WORST:
            period = 2.0 * math.pi / self._frequency
            raise RunError(
                f"waves of period {period:.4g} s: {CYCLES * BASIS} iterations leave {left:.2g} of "
                f"the equation open, {WORST:g} wanted; give a wider absorber or a coarser grid"
            )
        return self._continued(found)

    def _left_side(self, potential: Complex) -> Complex:
        still = np.zeros((len(self._flow.elements.hull), 2))
        continued = self._continued(potential)
        rise = self._flow.surface_flux(_parts(continued[:, None]), still)
        water = _whole(rise)[self._water, 0]
        return np.asarray(self._gravity * water - self._shift * potential)

    def _divide(self, rest: Complex) -> Complex:
        spectrum = fft.fft2(self._spread(rest).reshape(self._sea.shape), workers=-1)
        return np.asarray(fft.ifft2(self._sea * spectrum, workers=-1)).ravel()[self._water]

    def _continued(self, potential: Complex) -> Complex:
        return _whole(self._flow.continuation(_parts(self._spread(potential)[:, None])))[:, 0]

    def _spread(self, potential: Complex) -> Complex:
        field = np.zeros(self._flow.sheet.size, dtype=complex)
        field[self._water] = potential
        return field


def _parts(fields: Complex) -> Array:
    """(n, 2k): real parts, then imaginary ones."""
    return np.hstack([fields.real, fields.imag])


def _whole(parts: Array) -> Complex:
    """(n, k) from what `_parts` makes."""
    real, imaginary = np.split(parts, 2, axis=1)
    return np.asarray(real + 1j * imaginary)
