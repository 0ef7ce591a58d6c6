"""The absorbing layer round the useful water: its size, and what it does to waves.

Outside the useful water the surface is damped, eta_t = w - nu eta, with nu growing with the square
of the distance; the potential is left alone, so that energy only ever falls, by g int nu eta^2 a
second. Damping the potential by as much too is no better: in deep water the best layer a wavelength
wide then leaves 1.6 %, this one .9 % (both by the computation of `damped_line`).

On a periodic grid the layers of opposite sides touch at the seam: what one does not absorb passes
through the other, back to front, and enters the useful water again. A layer is as strong as sends
least energy back by both ways; where nothing is behind it, all of that is reflected.

Waves that come at an angle see a thinner layer: one that reflects 1 % of waves that come straight
reflects 4 % at 30 degrees and 11 % at 45.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from bemwave.errors import InputError
from bemwave.stepping.damped_line import Behind, Waves, returned

Array = npt.NDArray[np.float64]

LIMIT = 0.005  # reflected, and passed on: what a layer of automatic width keeps to
NARROWEST, WIDEST = 0.02, 25.0  # of the longest waves: a given width beyond is a slip of the pen

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
    passed : amplitude of them that it lets through, with the layer of the opposite side.
    """

    width: float
    strength: float
    reflection: float
    passed: float = 0.0

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
    behind: Behind = "still water",
    limit: float = LIMIT,
) -> Layer:
    """The layer for waves of up to a wavelength, of the strength that returns least of those.

    Parameters
    ----------
    wavelength : of the longest waves, m.
    depth : m, or math.inf.
    gravity : m/s^2.
    spacing : panel or grid size, m.
    width : m; by default the least of a wavelength or more, in whole panels or cells, that keeps
        within the limit.
    behind : what lies behind the layer: open "still water", a "wall", or on a periodic grid
        "itself", the layer of the opposite side.
    limit : of the reflection, and of what is passed on, where the width is not given.

    Raises
    ------
    InputError
        If the spacing is too large for the waves, or the width absurd for them, or no layer of up
        to three wavelengths keeps within the limit.

    Examples
    --------
    >>> layer_for(40.0, math.inf, 9.80665, 2.5).width
    42.5
    """
    waves = Waves(wavelength, depth, gravity)
    if width is not None:
        narrowest, widest = max(spacing, NARROWEST * wavelength), WIDEST * wavelength
        if not narrowest <= width <= widest:
            raise InputError(
                f"[surface] absorber = {width:g} m was given for waves of up to {wavelength:.3g} m "
                f"and a spacing of {spacing:g} m; expected a width from {narrowest:.3g} to "
                f'{widest:.4g} m, or "auto"'
            )
        return _tuned(width, waves, spacing, behind)
    first = math.ceil(wavelength / spacing * (1.0 - 1e-9))
    for cells in range(first, 3 * first + 1, max(1, first // 16)):
        layer = _tuned(cells * spacing, waves, spacing, behind)
        if max(layer.reflection, layer.passed) <= limit:
            return layer
    raise InputError(
        f"no absorber up to {3 * first * spacing:g} m wide keeps what returns of waves "
        f"{wavelength:g} m long within {limit:g}: give [surface] absorber a width in metres"
    )


def _tuned(width: float, waves: Waves, spacing: float, behind: Behind) -> Layer:
    """The layer of one width that returns least: the best of a few strengths, then of finer."""

    def best_of(strengths: Array) -> tuple[int, Layer]:
        reflected, passed = returned(width, strengths, waves, spacing, behind)
        i = int(np.argmin(np.hypot(reflected, passed)))
        return i, Layer(width, float(strengths[i]), float(reflected[i]), float(passed[i]))

    best, _ = best_of(_STRENGTHS * waves.frequency)
    near = _STRENGTHS[max(best - 1, 0)], _STRENGTHS[min(best + 1, len(_STRENGTHS) - 1)]
    return best_of(np.linspace(*near, 9) * waves.frequency)[1]


@dataclass(frozen=True)
class Returned:
    """What a layer makes of waves: amplitudes over that of those that reach it.

    Attributes
    ----------
    wavelength : m.
    angle : between the waves' heading and the layer's normal, rad.
    reflected : sent back.
    passed : let through, with the layer of the opposite side.
    """

    wavelength: float
    angle: float
    reflected: float
    passed: float


def forecast(
    layer: Layer, depth: float, gravity: float, spacing: float, behind: Behind = "still water"
) -> Iterator[Returned]:
    """What a layer makes of waves 1, .57 and .25 times its width long, straight and at 45 degrees.

    Those too short for the spacing are left out. Parameters as `layer_for`.
    """
    for share in (1.0, 0.57, 0.25):
        for angle in (0.0, math.pi / 4):
            waves = Waves(share * layer.width, depth, gravity, angle)
            if 3.0 * spacing <= waves.wavelength:
                strength = np.array([layer.strength])
                reflected, passed = returned(layer.width, strength, waves, spacing, behind)
                yield Returned(waves.wavelength, angle, float(reflected[0]), float(passed[0]))
