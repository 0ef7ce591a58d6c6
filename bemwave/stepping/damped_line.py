"""Waves on a line across an absorbing layer, at one frequency: what comes back, what gets through.

    (g S - w^2 M - i w M_nu) phi = a maker of waves,

S from the symbol |k| tanh(|k| h); a maker's middle at 0, useful water, the layer at the end, all
potentials even or odd about 0. Opposite waves are fitted in the useful water. Waves that meet the
layer at an angle have the wavenumber k sin(angle) along it, otherwise all is the same.

On panels, linear elements: M is their mass, and behind the layer the surface is still or mirrored
in a wall. On a periodic grid, its nodes: M is one, and behind the layer lies that of the opposite
side, back to front. A wave that enters both from their useful sides, equal or opposite, sees a
mirror at the seam: of one wave, r reflected and t passed on, those two return r + t and r - t.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt
from scipy.optimize import brentq

from bemwave.errors import InputError

Array = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]
Behind = Literal["still water", "wall", "itself"]

_NODES = 16  # a wavelength, at most: more do not change what a layer reflects
_MAKER = 0.75  # width of the wave maker [waves]
_PANELS = 2.625, 5.5  # where the wave maker ends, and the layer begins [waves]
_GRID = 3.5, 7.0  # the same, farther: so little passes the seam that the maker's own field counts


@dataclass(frozen=True)
class Waves:
    """Regular waves that meet a layer.

    Attributes
    ----------
    wavelength : m.
    depth : m, or math.inf.
    gravity : m/s^2.
    angle : between their heading and the layer's normal, rad.
    """

    wavelength: float
    depth: float
    gravity: float
    angle: float = 0.0

    @property
    def wavenumber(self) -> float:
        """1/m."""
        return 2.0 * math.pi / self.wavelength

    @property
    def along(self) -> float:
        """Wavenumber along the line, so across the layer [1/m]."""
        return self.wavenumber * math.cos(self.angle)

    @property
    def frequency(self) -> float:
        """rad/s."""
        k = self.wavenumber
        return math.sqrt(self.gravity * k * math.tanh(k * self.depth))

    def rise(self, along: Array) -> Array:
        """|k| tanh(|k| h) of wavenumbers along the line, that across it being these waves' own."""
        k = np.hypot(along, self.wavenumber * math.sin(self.angle))
        return np.asarray(k * np.tanh(k * min(self.depth, 1e4 * self.wavelength)))  # 0 inf is nan


def returned(
    width: float, strengths: Array, waves: Waves, spacing: float, behind: Behind
) -> tuple[Array, Array]:
    """Amplitudes reflected and passed on by layers of one width, over that of what enters them.

    Parameters
    ----------
    width : m.
    strengths : (n,) rates at the layers' rims, 1/s.
    waves : that enter.
    spacing : of panels or nodes, m; finer ones than the waves need count as coarser.
    behind : open "still water" or a "wall", both of panels, or on a periodic grid, which is
        joined to "itself", the layer of the opposite side.

    Returns
    -------
    Both (n,); nothing is passed on but behind "itself".

    Raises
    ------
    InputError
        If the spacing is too large for the waves.
    """
    if not 0.0 < 3.0 * spacing <= waves.wavelength:
        raise InputError(
            f"a spacing of {spacing:g} m was given for waves {waves.wavelength:g} m long, too "
            f"large to damp them by: give [surface] spacing {waves.wavelength / 6:.3g} m or less"
        )
    if behind == "itself":
        line = _Line(width, waves, spacing, *_GRID)
        equal, opposite = (_of_grid(line, strengths, parity) for parity in (1, -1))
        return 0.5 * np.abs(equal + opposite), 0.5 * np.abs(equal - opposite)
    line = _Line(width, waves, spacing, *_PANELS)
    reflected = np.abs(_of_panels(line, strengths, behind == "wall"))
    return reflected, np.zeros(len(strengths))


class _Line:
    """Cells from the wave maker's middle to the layer's rim, and what a fit in between finds."""

    def __init__(
        self, width: float, waves: Waves, spacing: float, clear: float, useful: float
    ) -> None:
        self.waves = waves
        self.damped = max(1, round(width / max(spacing, waves.wavelength / _NODES)))
        self.cell = width / self.damped
        apparent = 2.0 * math.pi / waves.along  # from crest to crest along the line
        self.still = round(useful * apparent / self.cell)
        self.cells = self.still + self.damped
        self.x = np.arange(self.cells + 1) * self.cell
        self.clear = slice(math.ceil(clear * apparent / self.cell), self.still - self.still // 22)
        self.packet = np.exp(-0.5 * (self.x / (_MAKER * apparent)) ** 2)

    def come_back(
        self,
        undamped: Array,
        damping: Array,
        strengths: Array,
        maker: Array,
        wavenumber: float,
    ) -> Complex:
        """Amplitude of the waves that come back over that of those that leave, complex, (n,)."""
        system = undamped - 1j * self.waves.frequency * strengths[:, None, None] * damping
        load = np.broadcast_to(maker, (len(strengths), len(maker)))[..., None]
        potential = np.linalg.solve(system, load.astype(complex))[:, self.clear, 0]
        out = np.exp(1j * wavenumber * self.x[self.clear])
        waves = np.linalg.lstsq(np.stack([out, out.conj()], axis=1), potential.T, rcond=None)[0]
        return np.asarray(waves[1] / waves[0])

    def flow_map(self, ring: int, symbol: Callable[[Array], Array], parity: int) -> Array:
        """S on nodes 0 ... cells, for potentials even (1) or odd (-1) about 0, on a ring.

        Without the share of a half that nodes on an axis of symmetry have.
        """
        turn = np.asarray(2.0 * math.pi * np.fft.fftfreq(ring), dtype=np.float64)
        row = np.fft.ifft(symbol(turn)).real
        i = np.arange(self.cells + 1)
        result: Array = row[(i[:, None] - i) % ring] + parity * row[(i[:, None] + i) % ring]
        return result


def _of_grid(line: _Line, strengths: Array, parity: int) -> Complex:
    """On the nodes of a ring that is even or odd about the maker's middle and the seam."""
    waves = line.waves
    w, g = waves.frequency, waves.gravity
    flow = line.flow_map(2 * line.cells, lambda turn: waves.rise(turn / line.cell), parity)
    flow[:, [0, -1]] *= 0.5  # nodes that are their own images
    profile = np.clip(np.arange(-line.still, line.damped + 1) / line.damped, 0.0, None) ** 2
    maker = (np.cos if parity == 1 else np.sin)(waves.along * line.x) * line.packet
    undamped = g * flow - w**2 * np.eye(len(line.x))
    return line.come_back(undamped, np.diag(profile), strengths, maker, waves.along)


def _of_panels(line: _Line, strengths: Array, closed: bool) -> Complex:
    """On linear elements: a ring that ends at a mirror, or is long and still."""
    waves = line.waves
    w, g = waves.frequency, waves.gravity
    ring = 2 * line.cells if closed else 1 << math.ceil(math.log2(16 * line.cells))
    nodes = np.arange(line.cells + closed)  # the last one, where it is still, left out
    share = np.where((nodes == 0) | (nodes == line.cells), 0.5, 1.0)  # half a hat at a mirror
    flow = line.flow_map(ring, lambda turn: _symbol_of_hats(waves, turn, line.cell), 1)
    flow = line.cell * flow[np.ix_(nodes, nodes)] * share[:, None] * share
    mass = _mass_of_hats(np.ones(line.cells), line.cell)[np.ix_(nodes, nodes)]
    profile = np.zeros(line.cells)
    profile[line.still :] = ((np.arange(line.damped) + 0.5) / line.damped) ** 2
    damping = _mass_of_hats(profile, line.cell)[np.ix_(nodes, nodes)]
    maker = mass @ (np.cos(waves.along * line.x) * line.packet)[nodes]
    k = _wavenumber_of_hats(waves, line.cell)
    # the fit is in useful water, so that a node left out at the rim is not missed
    return line.come_back(g * flow - w**2 * mass, damping, strengths, maker, k)


def _symbol_of_hats(waves: Waves, turn: Array, cell: float) -> Array:
    """What hats make of |k| tanh(|k| h), per cell, for a phase of `turn` from node to node."""
    harmonics = turn + 2.0 * math.pi * np.arange(-24, 25)[:, None]
    weight = np.sinc(harmonics / (2.0 * math.pi)) ** 4
    return np.asarray(np.sum(waves.rise(harmonics / cell) * weight, axis=0))


def _mass_of_hats(weight: Array, cell: float) -> Array:
    """int weight hat_i hat_j, weight (cells,) one a cell; (cells + 1, cells + 1)."""
    third, sixth = cell * weight / 3.0, cell * weight / 6.0
    diagonal = np.append(third, 0.0) + np.append(0.0, third)
    return np.asarray(np.diag(diagonal) + np.diag(sixth, 1) + np.diag(sixth, -1))


def _wavenumber_of_hats(waves: Waves, cell: float) -> float:
    """Of the elements' own waves, along the line, 1/m; close to the true one."""

    def excess(turn: float) -> float:
        stiffness = _symbol_of_hats(waves, np.array([turn]), cell)[0]
        return float(waves.gravity * stiffness / waves.frequency**2 - (2.0 + math.cos(turn)) / 3.0)

    turn = waves.along * cell
    return float(brentq(excess, 0.9 * turn, min(1.1 * turn, math.pi))) / cell
