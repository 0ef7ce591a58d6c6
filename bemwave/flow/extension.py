"""A gridded field continued harmonically into the water below it, read at any point.

The field and its slope are transformed back on a few planes only, the deeper the coarser: waves
shorter than the depth of a plane have died out there. Over each plane they are splines. Between
two planes Laplace's equation turns horizontal derivatives into vertical ones, so that value and
three derivatives are known on both, and the polynomial of seventh degree in z that has them all is
within (k h)^8 / 10^7 of a wave k between planes h apart: 2e-4 of its height at the surface, for
waves of six nodes and longer.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt
from scipy import fft

from bemwave.flow.sheet import Sheet
from bemwave.kernels.splines import AT_NODES, spline_sums

Array = npt.NDArray[np.float64]
Floats = npt.NDArray[np.float32]
Complex = npt.NDArray[np.complex64]
Ints = npt.NDArray[np.int64]

FIRST = 2.0  # spacings from the surface to the first plane below it
RATIO = 2.0  # of a plane's depth to that of the plane above
FINENESS = 3.0  # cells of a plane in its depth: what is left out is below exp(-3 pi)
SMALLEST = 16  # nodes along an axis

Order = tuple[int, int]  # of derivatives along x and y

# those that make up the vertical ones: f_zz = -(f_xx + f_yy), and so on
ORDERS: list[Order] = [(0, 0), (1, 0), (0, 1), (2, 0), (0, 2), (3, 0), (1, 2), (2, 1), (0, 3),
                       (4, 0), (2, 2), (0, 4)]  # fmt: skip


@dataclass(frozen=True)
class Plane:
    """One level of the extension: how coarse its grid is and what it makes of a spectrum.

    Attributes
    ----------
    sheet : at the surface.
    z : m, <= 0.
    """

    sheet: Sheet
    z: float

    @cached_property
    def shape(self) -> tuple[int, int]:
        """Nodes along x and y."""
        finest = min(1.0, FINENESS * self.sheet.spacing / max(-self.z, self.sheet.spacing))
        nx, ny = (
            min(n, max(SMALLEST, 2 * fft.next_fast_len(math.ceil(0.5 * n * finest), real=True)))
            for n in self.sheet.shape
        )
        return nx, ny

    @cached_property
    def cells(self) -> Array:
        """(2,) size of a cell along x and y [m]."""
        size: Array = self.sheet.spacing * np.array(self.sheet.shape) / np.array(self.shape)
        return size

    @cached_property
    def multipliers(self) -> Floats:
        """(2, nx, ny/2 + 1) from a spectrum cut to `shape` to splines of value and d/dz here.

        Waves of exactly two nodes are left out.
        """
        (nx, ny), (dx, dy) = self.shape, self.cells
        kx = 2.0 * math.pi * fft.fftfreq(nx, dx)[:, None]
        ky = 2.0 * math.pi * fft.rfftfreq(ny, dy)[None, :]
        k, h = np.hypot(kx, ky), self.sheet.depth
        value = np.exp(k * self.z) * nx * ny / self.sheet.size
        rise = k
        if math.isfinite(h):
            value *= (1.0 + np.exp(-2.0 * k * (self.z + h))) / (1.0 + np.exp(-2.0 * k * h))
            rise = k * np.tanh(k * (self.z + h))
        value /= _at_nodes(kx * dx) * _at_nodes(ky * dy)
        value[nx // 2], value[:, -1] = 0.0, 0.0
        return np.stack([value, value * rise]).astype(np.float32)

    def coefficients(self, spectrum: Complex) -> tuple[Floats, Floats]:
        """(nx, ny) of splines of value and of d/dz, from the surface's half spectrum."""
        (nx, ny), (value, slope) = self.shape, self.multipliers
        half, width = nx // 2, ny // 2 + 1
        cut = np.empty((nx, width), dtype=np.complex64)

        def back(factor: Floats) -> Floats:
            np.multiply(spectrum[:half, :width], factor[:half], out=cut[:half])
            np.multiply(spectrum[-half:, :width], factor[half:], out=cut[half:])
            field: Floats = fft.irfft2(cut, s=self.shape, overwrite_x=True, workers=-1)
            return field

        return back(value), back(slope)


class Planes:
    """The levels below one sheet, each made when a point first needs it."""

    def __init__(self, sheet: Sheet) -> None:
        self.sheet = sheet
        self._made: dict[int, Plane] = {}

    def __getitem__(self, level: int) -> Plane:
        if level not in self._made:
            self._made[level] = Plane(self.sheet, self.z(level))
        return self._made[level]

    def z(self, level: int) -> float:
        """Of a plane [m]; the last one is the bed."""
        down = FIRST * self.sheet.spacing * RATIO ** (level - 1) if level else 0.0
        return -min(down, self.sheet.depth)

    def above(self, z: Array) -> Ints:
        """(n,) level of the plane next above each z, and above the bed."""
        lowest = 0
        while -self.z(lowest + 1) < min(-z.min(initial=0.0), self.sheet.depth):
            lowest += 1
        edges = [-self.z(level) for level in range(lowest + 1)]
        return np.clip(np.searchsorted(edges, -z) - 1, 0, lowest)


class Extension:
    """One field's extension.

    Parameters
    ----------
    planes : of the sheet.
    field : (nx ny,) at the sheet's nodes.
    """

    def __init__(self, planes: Planes, field: Array) -> None:
        self._planes = planes
        self._mean = float(field.mean())
        # single precision is ample for what follows, once the mean is taken out
        rest = np.empty(planes.sheet.shape, dtype=np.float32)
        np.subtract(field.reshape(rest.shape), self._mean, out=rest, casting="same_kind")
        self._spectrum: Complex = np.asarray(fft.rfft2(rest, overwrite_x=True, workers=-1))
        self._coefficients: dict[int, tuple[Floats, Floats]] = {}

    def at_surface(self, xy: Array, orders: list[Order]) -> Array:
        """(k, n) horizontal derivatives at places (n, 2) of z = 0; the value itself is (0, 0)."""
        found: Array = self._derivatives(0, xy, orders)[0]
        found[[order == (0, 0) for order in orders]] += self._mean
        return found

    def value(self, points: Array) -> Array:
        """(n,) at points (n, 3)."""
        rest: Array = self._between(points, self._of_value)[0]
        return self._mean + rest

    def gradient(self, points: Array) -> Array:
        """(n, 3) at points (n, 3), per metre."""
        return self._between(points, self._of_gradient).T

    def _between(self, points: Array, rates: Callable[[int, Array], Array]) -> Array:
        """(c, n) of c fields whose vertical derivatives on a level are told by `rates`."""
        level = self._planes.above(points[:, 2])
        order = np.argsort(level, kind="stable")
        found = []
        for rows in np.split(order, np.flatnonzero(np.diff(level[order])) + 1):
            number = int(level[rows[0]])
            xy, top = points[rows, :2], self._planes.z(number)
            height = top - self._planes.z(number + 1)
            share = (top - points[rows, 2]) / height
            found.append(_polynomial(share, height, rates(number, xy), rates(number + 1, xy)))
        result = np.empty((len(found[0]), len(points)))
        result[:, order] = np.concatenate(found, axis=1)
        return result

    def _of_value(self, level: int, xy: Array) -> Array:
        """(4, 1, n) the value and three vertical derivatives."""
        f, g = self._tables(level, xy, [(0, 0), (2, 0), (0, 2)])
        return np.array([[f[0, 0]], [g[0, 0]], [-_bend(f, 0, 0)], [-_bend(g, 0, 0)]])

    def _of_gradient(self, level: int, xy: Array) -> Array:
        """(4, 3, n) the gradient and three vertical derivatives of it."""
        f, g = self._tables(level, xy, ORDERS)
        fourth = f[4, 0] + 2.0 * f[2, 2] + f[0, 4]
        return np.array(
            [
                [f[1, 0], f[0, 1], g[0, 0]],
                [g[1, 0], g[0, 1], -_bend(f, 0, 0)],
                [-_bend(f, 1, 0), -_bend(f, 0, 1), -_bend(g, 0, 0)],
                [-_bend(g, 1, 0), -_bend(g, 0, 1), fourth],
            ]
        )

    def _tables(self, level: int, xy: Array, orders: list[Order]) -> list[dict[Order, Array]]:
        """Horizontal derivatives of the value and of its slope on a level, by their orders."""
        both = self._derivatives(level, xy, orders)
        return [dict(zip(orders, rows, strict=True)) for rows in both]

    def _derivatives(self, level: int, xy: Array, orders: list[Order]) -> Array:
        """(2, k, n) horizontal derivatives of the value and of its slope on a level."""
        plane, sheet = self._planes[level], self._planes.sheet
        if level not in self._coefficients:
            self._coefficients[level] = plane.coefficients(self._spectrum)
        which = np.array(orders)
        at = (xy - [sheet.west, sheet.south]) / plane.cells
        sums: Array = spline_sums(self._coefficients[level], at, which)
        per_metre: Array = 1.0 / np.prod(plane.cells**which, axis=1)
        return sums * per_metre[:, None]


def _bend(f: dict[Order, Array], a: int, b: int) -> Array:
    """Horizontal Laplacian of the derivative (a, b)."""
    bend: Array = f[a + 2, b] + f[a, b + 2]
    return bend


def _polynomial(s: Array, h: float, top: Array, bottom: Array) -> Array:
    """(c, n) a share s of the height h below a plane, from derivatives (4, c, n) on both planes.

    Hermite's interpolation of value and three derivatives at two points.
    """
    total: Array = np.zeros_like(top[0])
    for m in range(4):
        total += _hermite(m, s) * (-h) ** m * top[m] + _hermite(m, 1.0 - s) * h**m * bottom[m]
    return total


def _hermite(m: int, s: Array) -> Array:
    """What the m-th derivative at 0 adds at s, all else at 0 and 1 being zero."""
    series = sum((math.comb(3 + i, i) * s**i for i in range(4 - m)), np.zeros_like(s))
    return np.asarray(s**m / math.factorial(m) * (1.0 - s) ** 4 * series)


def _at_nodes(angle: Array) -> Array:
    """Transform of the spline's values at nodes, at angles of k times the spacing."""
    total = np.full_like(angle, AT_NODES[0])
    for j, value in enumerate(AT_NODES[1:], 1):
        total += 2.0 * value * np.cos(j * angle)
    return total
