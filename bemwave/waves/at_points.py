"""A sea at fixed points: fast sums over its components.

Every field is a sum over components j of Re(weight_j base_j(point) exp(-i w_j t)). The bases
depend on the points alone and are computed once; what turns a base into a velocity or a pressure
goes into the weights beside the time factor. So one matrix serves several fields, and each field
is one real matrix product [cos | sin](time, 2n) @ base(2n, point).
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave.errors import InputError

if TYPE_CHECKING:
    from bemwave.waves.sea import Sea

Array = NDArray[np.float64]
Weights = NDArray[np.floating[Any]] | NDArray[np.complexfloating[Any, Any]]
Base = Literal["surface", "cosh", "sinh"]

BLOCK_BYTES = 2**26  # of one block of a base, and of one block of time factors


def depth_factors(k: ArrayLike, z: ArrayLike, depth: float) -> tuple[Array, Array]:
    """cosh k(z+h)/cosh kh and sinh k(z+h)/cosh kh, without overflow, deep water included.

    Linear wave theory (Dean & Dalrymple 1991, chapter 3). The arguments broadcast; 1/m and m.
    """
    k, z = np.asarray(k, dtype=float), np.asarray(z, dtype=float)
    scale = np.exp(k * z) / (1 + np.exp(-2 * k * depth))
    from_bed = -2 * k * (z + depth)
    return scale * (1 + np.exp(from_bed)), -scale * np.expm1(from_bed)


class SeaAtPoints:
    """The incident fields of a `Sea` at fixed points, as functions of time.

    Made by `Sea.at`. In every method `t` is a number or an array of seconds, and the result has
    the shape of `t`, then that of the points, then 3 for a vector. Above still water (z > 0)
    velocity, acceleration and potential are those of z = 0, and the pressure is rho g elevation;
    `bemwave.waves.crest` has the other rules for crests.

    Parameters
    ----------
    sea : Sea
    points : array (..., 3)
        Earth coordinates in metres.
    memory : float
        Bytes that may be kept between calls; what does not fit is computed again at each call.
    """

    def __init__(self, sea: Sea, points: ArrayLike, memory: float = 2**30) -> None:
        array = np.asarray(points, dtype=float)
        if array.ndim == 0 or array.shape[-1] != 3:
            raise InputError(
                f"points of shape {array.shape} were given to a sea; expected (..., 3): x, y, z"
            )
        self.sea = sea
        self._shape = array.shape[:-1]
        self._points = array.reshape(-1, 3)
        self._on_surface = bool(np.all(self._points[:, 2] >= 0))
        self._memory = memory
        self._kept: dict[tuple[Base, int], Array] = {}

    def elevation(self, t: ArrayLike) -> Array:
        """Surface elevation in metres at the points' x, y."""
        return self._scalar(t, "surface", np.ones(self.sea.count))

    def elevation_rate(self, t: ArrayLike) -> Array:
        """d(elevation)/dt in m/s; equals the vertical velocity at z = 0."""
        return self._scalar(t, "surface", -1j * self.sea.frequency)

    def potential(self, t: ArrayLike) -> Array:
        """Velocity potential in m^2/s."""
        return self._scalar(t, "cosh", -1j * self.sea.gravity / self.sea.frequency)

    def pressure(self, t: ArrayLike) -> Array:
        """Dynamic pressure -rho phi_t in Pa."""
        weight = self.sea.density * self.sea.gravity
        return self._scalar(t, "cosh", np.full(self.sea.count, weight))

    def velocity(self, t: ArrayLike) -> Array:
        """Velocity in m/s; the last axis holds u, v, w."""
        return self._vector(t, self.sea.gravity * self.sea.wavenumber / self.sea.frequency)

    def displacement(self, t: ArrayLike) -> Array:
        """How far the water has moved from the points, in metres; the last axis holds x, y, z.

        First order: the integral of the velocity at the fixed points, without a mean.
        """
        sea = self.sea
        return self._vector(t, 1j * sea.gravity * sea.wavenumber / sea.frequency**2)

    def acceleration(self, t: ArrayLike) -> Array:
        """d(velocity)/dt at the fixed points in m/s^2 (linear: no advective part)."""
        return self._vector(t, -1j * self.sea.gravity * self.sea.wavenumber)

    def velocity_slope(self, t: ArrayLike) -> Array:
        """d(velocity)/dz in 1/s at z = 0 of each point's x, y, whatever its own z."""
        sea = self.sea
        weight = sea.gravity * sea.wavenumber**2 / sea.frequency
        east, north = np.cos(sea.heading), np.sin(sea.heading)
        tanh = np.tanh(sea.wavenumber * sea.depth)
        weights = np.stack([weight * tanh * east, weight * tanh * north, -1j * weight])
        return np.moveaxis(self._field(t, "surface", weights), 0, -1)

    def _scalar(self, t: ArrayLike, base: Base, weight: ArrayLike) -> Array:
        field: Array = self._field(t, base, np.asarray(weight)[None])[0]
        return field

    def _vector(self, t: ArrayLike, weight: Weights) -> Array:
        """Field whose potential is weight/k sin: horizontal on the cosh base, vertical on sinh."""
        along = np.stack([np.cos(self.sea.heading), np.sin(self.sea.heading)]) * weight
        horizontal = self._field(t, "cosh", along)
        vertical = self._field(t, "sinh", -1j * weight[None])
        return np.moveaxis(np.concatenate([horizontal, vertical]), 0, -1)

    def _field(self, t: ArrayLike, base: Base, weights: Weights) -> Array:
        """Sum over components for each row of weights (q, n): shape (q, *t.shape, *points)."""
        times = np.asarray(t, dtype=float)
        flat = times.reshape(-1)
        if self._on_surface and base == "sinh":
            weights = weights * np.tanh(self.sea.wavenumber * self.sea.depth)
        if self._on_surface:
            base = "surface"
        rows = len(weights)
        out = np.empty((rows, flat.size, len(self._points)))
        step = _block(rows * self.sea.count)
        for start, stop in self._blocks():
            matrix = self._base(base, start, stop)
            for first in range(0, flat.size, step):
                product = self._time_factors(flat[first : first + step], weights) @ matrix
                out[:, first : first + step, start:stop] = product.reshape(rows, -1, stop - start)
        return out.reshape(rows, *times.shape, *self._shape)

    def _time_factors(self, t: Array, weights: Weights) -> Array:
        """Real and (negative) imaginary part of weight exp(-i w t), shape (q nt, 2n)."""
        turned = weights[:, None, :] * np.exp(-1j * np.outer(t, self.sea.frequency))
        turned = turned.reshape(len(weights) * len(t), self.sea.count)
        return np.concatenate([turned.real, -turned.imag], axis=1)

    def _blocks(self) -> list[tuple[int, int]]:
        step, total = _block(self.sea.count), len(self._points)
        return [(start, min(start + step, total)) for start in range(0, total, step)]

    def _base(self, name: Base, start: int, stop: int) -> Array:
        """Return the base (2n, points) of a block, from the store or computed."""
        kept = self._kept.get((name, start))
        if kept is not None:
            return kept
        base = self._compute_base(name, self._points[start:stop])
        if base.nbytes <= self._memory:
            self._memory -= base.nbytes
            self._kept[name, start] = base
        return base

    def _compute_base(self, name: Base, points: Array) -> Array:
        sea = self.sea
        x, y, z = points.T
        angle = np.outer(sea.wavenumber * np.cos(sea.heading), x)
        angle += np.outer(sea.wavenumber * np.sin(sea.heading), y)
        angle += sea.phase[:, None]
        size = np.broadcast_to(sea.amplitude[:, None], angle.shape)
        if name != "surface":
            cosh, sinh = depth_factors(sea.wavenumber[:, None], np.minimum(z, 0.0), sea.depth)
            size = size * (cosh if name == "cosh" else sinh)
        base = np.empty((2 * sea.count, len(points)))
        np.multiply(size, np.cos(angle), out=base[: sea.count])
        np.multiply(size, np.sin(angle), out=base[sea.count :])
        return base


def _block(components: int) -> int:
    """How many points (or instants) make one block for so many components."""
    return max(1, BLOCK_BYTES // (16 * max(components, 1)))
