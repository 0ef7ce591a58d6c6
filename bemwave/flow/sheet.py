"""A uniform periodic grid on still water: wavenumbers, harmonic extension, local interpolation."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt
from scipy import fft, sparse

Array = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]

STENCIL = 6  # nodes along each axis of an interpolation: fifth degree


@dataclass(frozen=True)
class Sheet:
    """Nodes x = west + i spacing, y = south + j spacing, fields (nx, ny), periodic.

    Attributes
    ----------
    west, south : corner [m].
    spacing : m.
    shape : (nx, ny), even.
    depth : m, or math.inf.
    """

    west: float
    south: float
    spacing: float
    shape: tuple[int, int]
    depth: float = math.inf

    @property
    def size(self) -> int:
        """Number of nodes."""
        return self.shape[0] * self.shape[1]

    @property
    def extent(self) -> tuple[float, float, float, float]:
        """Least and largest x, then y, of a period [m]."""
        nx, ny = self.shape
        east, north = self.west + self.spacing * nx, self.south + self.spacing * ny
        return self.west, east, self.south, north

    @cached_property
    def xy(self) -> Array:
        """(nx ny, 2) places of the nodes, j fastest [m]."""
        x = self.west + self.spacing * np.arange(self.shape[0])
        y = self.south + self.spacing * np.arange(self.shape[1])
        return np.stack([g.ravel() for g in np.meshgrid(x, y, indexing="ij")], axis=1)

    @cached_property
    def wavenumbers(self) -> tuple[Array, Array, Array]:
        """kx (nx, 1), ky (1, ny/2 + 1) and |k| of the half spectrum [1/m].

        A wave of exactly two nodes has no direction: its kx or ky is zero, so that it stays out of
        derivatives; but it has a length, and with |k| = 0 it would answer to any forcing like a
        wave of no frequency.
        """
        nx, ny = self.shape
        kx = 2.0 * math.pi * fft.fftfreq(nx, self.spacing)[:, None]
        ky = 2.0 * math.pi * fft.rfftfreq(ny, self.spacing)[None, :]
        k = np.hypot(kx, ky)
        kx[nx // 2], ky[:, -1] = 0.0, 0.0
        return kx, ky, k

    @cached_property
    def rise(self) -> Array:
        """|k| tanh(|k| h): what turns the potential into the surface's vertical velocity [1/m]."""
        k = self.wavenumbers[2]
        if math.isinf(self.depth):
            return k
        return np.asarray(k * np.tanh(k * self.depth))

    def transform(self, field: Array) -> Complex:
        """(..., nx, ny) to its half spectrum."""
        return np.asarray(fft.rfft2(field, workers=-1))

    def back(self, spectrum: Complex) -> Array:
        """Half spectrum to (..., nx, ny)."""
        return np.asarray(fft.irfft2(spectrum, s=self.shape, workers=-1))

    def coarser(self, factor: int) -> Sheet:
        """The sheet of every `factor`-th node."""
        nx, ny = self.shape
        shape = (nx // factor, ny // factor)
        return Sheet(self.west, self.south, self.spacing * factor, shape, self.depth)

    def cropped(self, spectrum: Complex, coarse: Sheet) -> Complex:
        """The long waves of a half spectrum, as that of the field on a coarser sheet's nodes."""
        (nx, ny), m = coarse.shape, coarse.shape[0] // 2
        kept = np.zeros((*spectrum.shape[:-2], nx, ny // 2 + 1), dtype=spectrum.dtype)
        kept[..., :m, :-1] = spectrum[..., :m, : ny // 2]
        kept[..., m + 1 :, :-1] = spectrum[..., -m + 1 :, : ny // 2]
        return np.asarray(kept * (coarse.size / self.size))

    def padded(self, spectrum: Complex, coarse: Sheet) -> Complex:
        """The transpose of `cropped` between fields: a coarser sheet's, spread over this one's."""
        ny, m = coarse.shape[1], coarse.shape[0] // 2
        wide = np.zeros((*spectrum.shape[:-2], self.shape[0], self.shape[1] // 2 + 1), complex)
        wide[..., :m, : ny // 2] = spectrum[..., :m, :-1]
        wide[..., -m + 1 :, : ny // 2] = spectrum[..., m + 1 :, :-1]
        return wide

    def interpolation(self, xy: Array, periodic: bool = True) -> sparse.csr_matrix:
        """(p, nx ny) from nodes to places (p, 2): Lagrange polynomials of fifth degree."""
        at = (np.asarray(xy) - [self.west, self.south]) / self.spacing
        first = np.floor(at).astype(np.int64) - STENCIL // 2 + 1
        if not periodic:
            first = np.clip(first, 0, np.array(self.shape) - STENCIL)
        weights = [_lagrange(at[:, axis] - first[:, axis]) for axis in (0, 1)]
        steps = np.arange(STENCIL)
        rows = (first[:, 0, None] + steps) % self.shape[0]
        columns = (first[:, 1, None] + steps) % self.shape[1]
        number = rows[:, :, None] * self.shape[1] + columns[:, None, :]
        values = weights[0][:, :, None] * weights[1][:, None, :]
        owner = np.repeat(np.arange(len(at)), STENCIL**2)
        return sparse.csr_matrix(
            (values.ravel(), (owner, number.ravel())), shape=(len(at), self.size)
        )


def _lagrange(at: Array) -> Array:
    """(p, STENCIL) weights of values at 0, 1, ... for places `at` between."""
    weights = np.ones((len(at), STENCIL))
    for i in range(STENCIL):
        for j in range(STENCIL):
            if i != j:
                weights[:, i] *= (at - j) / (i - j)
    return weights
