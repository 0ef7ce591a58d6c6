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
Ints = npt.NDArray[np.int64]

STENCIL = 6  # nodes along each axis of an interpolation: fifth degree
FEW_LINES = 64  # of a grid are summed sooner one by one than by a fast transform of all


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

    @property
    def axes(self) -> tuple[Array, Array]:
        """(nx,) and (ny,) x and y of the nodes [m]."""
        x = self.west + self.spacing * np.arange(self.shape[0], dtype=np.float64)
        y = self.south + self.spacing * np.arange(self.shape[1], dtype=np.float64)
        return x, y

    @cached_property
    def xy(self) -> Array:
        """(nx ny, 2) places of the nodes, j fastest [m]."""
        return np.stack([g.ravel() for g in np.meshgrid(*self.axes, indexing="ij")], axis=1)

    def at(self, nodes: Ints) -> Array:
        """(n, 2) places of some nodes by their numbers [m]."""
        x, y = self.axes
        row, column = np.divmod(nodes, self.shape[1])
        return np.stack([x[row], y[column]], axis=1)

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

    def add_long(self, spectrum: Complex, long: Complex, coarse: Sheet) -> None:
        """The transpose of `cropped` between fields: adds a coarser sheet's, in place."""
        ny, m = coarse.shape[1], coarse.shape[0] // 2
        spectrum[..., :m, : ny // 2] += long[..., :m, :-1]
        spectrum[..., -m + 1 :, : ny // 2] += long[..., m + 1 :, :-1]

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


class Lines:
    """Some lines of constant x of a sheet: their share of a spectrum without a whole transform.

    Parameters
    ----------
    sheet : the grid.
    rows : (m,) numbers of the lines.
    """

    def __init__(self, sheet: Sheet, rows: Ints) -> None:
        self._sheet, self._rows = sheet, rows
        nx = sheet.shape[0]
        self._few = len(rows) < FEW_LINES
        turns = np.outer(rows, np.arange(nx)) % nx if self._few else np.zeros((0, 0))
        angle = 2.0 * math.pi / nx * turns
        # cosines, then sines: a real product takes less than one of complex numbers
        self._waves = np.concatenate([np.cos(angle), np.sin(angle)])

    def of(self, spectrum: Complex) -> Array:
        """(k, m, ny) the field there, of its half spectrum (k, nx, ny/2 + 1)."""
        nx, ny = self._sheet.shape
        if self._few:
            pairs = spectrum.view(spectrum.real.dtype)
            cosines, sines = np.split((self._waves @ pairs).view(complex), 2, axis=1)
            along = (cosines + 1j * sines) / nx
        else:
            along = np.asarray(fft.ifft(spectrum, axis=1, workers=-1))[:, self._rows]
        return np.asarray(fft.irfft(along, n=ny))

    def spectrum(self, field: Array) -> Complex:
        """(k, nx, ny/2 + 1) of a field (k, m, ny) that is zero off the lines."""
        along = np.asarray(fft.rfft(field))
        if self._few:
            both = np.concatenate([along, -1j * along], axis=1)
            return np.asarray((self._waves.T @ both.view(float)).view(complex))
        whole = np.zeros((len(field), self._sheet.shape[0], along.shape[2]), dtype=complex)
        whole[:, self._rows] = along
        return np.asarray(fft.fft(whole, axis=1, overwrite_x=True, workers=-1))


def touched(maps: sparse.csr_matrix) -> tuple[Ints, sparse.csr_matrix]:
    """Numbers of the columns in which a matrix has entries, and what it is in these alone."""
    columns = np.unique(maps.indices)
    at = np.searchsorted(columns, maps.indices)
    shape = (maps.shape[0], len(columns))
    return columns.astype(np.int64), sparse.csr_matrix((maps.data, at, maps.indptr), shape=shape)


def _lagrange(at: Array) -> Array:
    """(p, STENCIL) weights of values at 0, 1, ... for places `at` between."""
    weights = np.ones((len(at), STENCIL))
    for i in range(STENCIL):
        for j in range(STENCIL):
            if i != j:
                weights[:, i] *= (at - j) / (i - j)
    return weights
