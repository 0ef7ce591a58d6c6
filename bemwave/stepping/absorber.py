"""The absorbing layer round the useful water, and a forecast of what it reflects.

Outside the useful water the surface is damped, eta_t = w - nu eta, with nu growing with the square
of the distance; the potential is left alone, so that energy only ever falls, by g int nu eta^2 a
second. Damping the potential by as much too is no better: in deep water the best layer a wavelength
wide then leaves 1.6 %, this one .9 % (both by the computation below).

The forecast is a computation with linear elements on a line across the layer, at one frequency,

    (g S - w^2 M - i w M_nu) phi = a maker of waves,

S from the symbol |k| tanh(|k| h) of a surface that is still beyond the layer's rim (open water) or
mirrored there (a wall), the reflection from a fit of two opposite waves in the useful water.
Waves that meet the layer at an angle have the wavenumber k sin(angle) along it, otherwise all is
the same. They see a thinner layer: one that reflects 1 % of waves that come straight reflects
4 % at 30 degrees and 11 % at 45.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.optimize import brentq

from bemwave.errors import InputError

Array = npt.NDArray[np.float64]

LIMIT = 0.005  # reflection that a layer of automatic width keeps to

_NODES = 16  # a wavelength, at most: more do not change what a layer reflects
_MAKER, _CLEAR, _USEFUL = 0.75, 2.625, 5.5  # wave maker's width, its end, layer's start [waves]
_STRENGTHS = np.geomspace(0.3, 8.0, 26)  # tried, over the waves' frequency


@dataclass(frozen=True)
class Layer:
    """A layer of damped water.

    Attributes
    ----------
    width : m.
    strength : rate at its outer rim, 1/s.
    reflection : amplitude that it sends back of the longest waves it is made for, coming
        straight, over theirs.
    """

    width: float
    strength: float
    reflection: float

    def rate(self, distance: Array) -> Array:
        """Rate nu at which the elevation is damped [1/s], at distances from the useful water [m].

        Zero within it, where the distance is zero.
        """
        return np.asarray(self.strength * (distance / self.width) ** 2)


def layer_for(
    wavelength: float,
    depth: float,
    gravity: float,
    spacing: float,
    *,
    width: float | None = None,
    closed: bool = False,
    limit: float = LIMIT,
) -> Layer:
    """The layer for waves of up to a wavelength, of the strength that reflects least of those.

    Parameters
    ----------
    wavelength : of the longest waves, m.
    depth : m, or math.inf.
    gravity : m/s^2.
    spacing : panel size, m.
    width : m; by default the least of a wavelength or more, in whole panels, that keeps within
        the limit.
    closed : whether a wall, not open water, lies behind the layer.
    limit : of the reflection, where the width is not given.

    Raises
    ------
    InputError
        If the panels are too large for the waves, or no layer of up to three wavelengths keeps
        within the limit.

    Examples
    --------
    >>> layer_for(40.0, math.inf, 9.80665, 2.5).width
    42.5
    """
    if width is not None:
        return _tuned(width, wavelength, depth, gravity, spacing, closed)
    first = math.ceil(wavelength / spacing * (1.0 - 1e-9))
    for cells in range(first, 3 * first + 1, max(1, first // 16)):
        layer = _tuned(cells * spacing, wavelength, depth, gravity, spacing, closed)
        if layer.reflection <= limit:
            return layer
    raise InputError(
        f"no absorber up to {3 * first * spacing:g} m wide keeps the reflection of waves "
        f"{wavelength:g} m long within {limit:g}: give [surface] absorber a width in metres"
    )


def _tuned(
    width: float, wavelength: float, depth: float, gravity: float, spacing: float, closed: bool
) -> Layer:
    """The layer of one width that reflects least: the best of a few strengths, then of finer."""
    line = _Line(width, wavelength, depth, gravity, spacing, 0.0, closed)
    coarse = line.reflections(_STRENGTHS * line.frequency)
    best = int(np.argmin(coarse))
    near = _STRENGTHS[max(best - 1, 0)], _STRENGTHS[min(best + 1, len(coarse) - 1)]
    strengths = np.linspace(*near, 9) * line.frequency
    fine = line.reflections(strengths)
    best = int(np.argmin(fine))
    return Layer(width, float(strengths[best]), float(fine[best]))


def reflection(
    layer: Layer,
    wavelength: float,
    depth: float,
    gravity: float,
    spacing: float,
    *,
    angle: float = 0.0,
    closed: bool = False,
) -> float:
    """What a layer sends back of any waves, amplitude over that of those that reach it.

    Parameters
    ----------
    layer : the layer.
    wavelength, depth, gravity, spacing, closed : as `layer_for`.
    angle : between the waves' heading and the layer's normal, rad.

    Raises
    ------
    InputError
        If the panels are too large for the waves.
    """
    line = _Line(layer.width, wavelength, depth, gravity, spacing, angle, closed)
    return float(line.reflections(np.array([layer.strength]))[0])


class _Line:
    """Linear elements across half the water: a wave maker's middle at 0, the layer at the end."""

    def __init__(
        self,
        width: float,
        wavelength: float,
        depth: float,
        gravity: float,
        spacing: float,
        angle: float,
        closed: bool,
    ) -> None:
        if not 0.0 < 3.0 * spacing <= wavelength:
            raise InputError(
                f"a spacing of {spacing:g} m was given for waves {wavelength:g} m long, too few "
                f"panels to damp them by: give [surface] spacing {wavelength / 6:.3g} m or less"
            )
        k = 2.0 * math.pi / wavelength
        self.across, self.along = k * math.sin(angle), k * math.cos(angle)
        self.depth = min(depth, 1e4 * wavelength)  # finite, for the product with k = 0
        self.gravity, self.frequency = gravity, math.sqrt(gravity * k * math.tanh(k * depth))
        damped = max(1, round(width / max(spacing, wavelength / _NODES)))
        self.cell = width / damped
        apparent = 2.0 * math.pi / self.along  # from crest to crest along the line
        still = round(_USEFUL * apparent / self.cell)
        self.x = np.arange(still + damped + closed) * self.cell
        self.clear = slice(math.ceil(_CLEAR * apparent / self.cell), still - still // 22)
        self.profile = np.zeros(still + damped)
        self.profile[still:] = ((np.arange(damped) + 0.5) / damped) ** 2
        self.maker = np.cos(self.along * self.x) * np.exp(
            -0.5 * (self.x / (_MAKER * apparent)) ** 2
        )
        self.flow = self._flow_map(still + damped, closed)
        self.mass = self._mass(np.ones(still + damped))

    def reflections(self, strengths: Array) -> Array:
        """Reflection for each strength [1/s] of the layer."""
        w, g = self.frequency, self.gravity
        damping = 1j * w * self._mass(self.profile)
        undamped = g * self.flow - w**2 * self.mass
        system = undamped - strengths[:, None, None] * damping
        load = np.broadcast_to(self.mass @ self.maker, (len(strengths), len(self.x)))[..., None]
        potential = np.linalg.solve(system, load.astype(complex))[:, self.clear, 0]
        out = np.exp(1j * self._wavenumber() * self.x[self.clear])
        waves = np.linalg.lstsq(np.stack([out, out.conj()], axis=1), potential.T, rcond=None)[0]
        result: Array = np.abs(waves[1] / waves[0])
        return result

    def _symbol(self, turn: npt.NDArray[np.floating]) -> Array:
        """What hats make of |k| tanh(|k| h), per cell, for a phase of `turn` from node to node."""
        harmonics = turn + 2.0 * math.pi * np.arange(-24, 25)[:, None]
        k = np.hypot(harmonics / self.cell, self.across)
        weight = np.sinc(harmonics / (2.0 * math.pi)) ** 4
        result: Array = np.sum(k * np.tanh(k * self.depth) * weight, axis=0)
        return result

    def _wavenumber(self) -> float:
        """Of the elements' own waves, along the line, 1/m; close to the true one."""

        def excess(turn: float) -> float:
            stiffness = self._symbol(np.array([turn]))[0]
            return float(
                self.gravity * stiffness / self.frequency**2 - (2.0 + math.cos(turn)) / 3.0
            )

        turn = self.along * self.cell
        return float(brentq(excess, 0.9 * turn, min(1.1 * turn, math.pi))) / self.cell

    def _flow_map(self, cells: int, closed: bool) -> Array:
        """S of even potentials about 0: on a ring that ends at a mirror, or is long and still."""
        ring = 2 * cells if closed else 1 << math.ceil(math.log2(16 * cells))
        turn = 2.0 * math.pi * np.fft.fftfreq(ring)
        row = self.cell * np.fft.ifft(self._symbol(turn)).real
        i = np.arange(len(self.x))
        share = np.where((i == 0) | (i == cells), 0.5, 1.0)  # half a hat at a mirror
        both = row[(i[:, None] - i) % ring] + row[(i[:, None] + i) % ring]
        result: Array = both * share[:, None] * share
        return result

    def _mass(self, weight: Array) -> Array:
        """int weight hat_i hat_j, weight (cells,) one a cell; the last node left out if still."""
        third, sixth = self.cell * weight / 3.0, self.cell * weight / 6.0
        diagonal = np.append(third, 0.0) + np.append(0.0, third)
        full = np.diag(diagonal) + np.diag(sixth, 1) + np.diag(sixth, -1)
        result: Array = full[: len(self.x), : len(self.x)]
        return result
