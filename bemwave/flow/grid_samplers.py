"""Velocity and pressure of the field solved on a grid, at fixed points.

The potential is that of the surface's extension and what the hulls make of it: the representation
formula of the half space over hulls and waterplanes, which together are closed. Within a spacing
of still water the sheets of a waterplane and of a hull's uppermost panels would show; there, and
near hulls alone, the field is the parabola in z that has the surface's value and slope at z = 0
and the formula's value a spacing down. Within a panel of a hull the field is only first order.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.spatial import KDTree

from bemwave.flow.blocks import BlockMap
from bemwave.flow.elements import Elements
from bemwave.flow.extension import Extension, Order, Planes
from bemwave.flow.images import make_images
from bemwave.flow.samplers import influences, under_water
from bemwave.flow.sheet import Sheet
from bemwave.flow.state import SurfaceState
from bemwave.kernels.points import potential_at

Array = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]
Ints = npt.NDArray[np.int64]

REACH = 2.5  # spacings from a node of a hull within which the surface's own fields are used
PART = 64  # points for which influences are held at a time

_VALUE: Order = (0, 0)
_SLOPES: list[Order] = [(1, 0), (0, 1)]
_BENDS: list[Order] = [(2, 0), (0, 2)]


class GridSamplers:
    """Makes samplers of one sheet and the hulls in it.

    Transforms of a state are shared by all samplers asked about it one after the other.

    Parameters
    ----------
    sheet : with its depth.
    elements : hulls and, as `water`, their waterplanes; normals out of the water. None pinned.
    density : kg/m^3, for pressures.
    """

    def __init__(self, sheet: Sheet, elements: Elements, *, density: float = 1025.0) -> None:
        self.sheet, self.elements, self.density = sheet, elements, density
        span = sheet.spacing * max(sheet.shape)
        self.images = make_images(sheet.depth, True, (), span)
        self.strip = min(sheet.spacing, 0.5 * sheet.depth)
        self._planes = Planes(sheet)
        self._state: SurfaceState | None = None
        self._extensions: dict[str, Extension] = {}

    def sampler(self, points: Array) -> PointSampler:
        """A sampler of velocity and pressure at points (n, 3), z <= 0.

        Raises
        ------
        InputError : if a point is above still water.
        """
        return PointSampler(self, under_water(points))

    def surface_sampler(self, xy: Array) -> SurfaceSampler:
        """A sampler of the surface at places xy (n, 2)."""
        return SurfaceSampler(self, np.asarray(xy, dtype=np.float64).reshape(-1, 2))

    def extension(self, state: SurfaceState, name: str) -> Extension:
        """Of one of the state's gridded fields."""
        if self._state is not state:
            self._state, self._extensions = state, {}
        if name not in self._extensions:
            self._extensions[name] = Extension(self._planes, getattr(state, name))
        return self._extensions[name]

    def made_by_hulls(self, points: Array, components: int) -> BlockMap | None:
        """The map from potential at nodes and flux on hull panels to velocities or potentials."""
        e = self.elements
        if not len(e.hull):
            return None

        def rows(places: Array, columns: Ints) -> Array:
            starts = range(0, len(places), PART)
            parts = [self._rows(places[i : i + PART], columns, components) for i in starts]
            return np.concatenate(parts)

        distance, _ = KDTree(e.points).query(points)
        # a potential over the size of the hulls weighs as much as a flux
        size = float(np.ptp(e.points, axis=0).max())
        weights = np.concatenate([np.full(e.nodes, size), np.ones(len(e.hull))])
        return BlockMap(points, np.asarray(distance), rows, weights, components)

    def _rows(self, points: Array, columns: Ints, components: int) -> Array:
        """(n, components, c) of the representation formula: chosen nodes and panels."""
        e = self.elements
        of_node = columns < e.nodes
        nodes, panels = columns[of_node], columns[~of_node] - e.nodes
        used = np.isin(e.hull, nodes).any(axis=1) | np.isin(np.arange(len(e.hull)), panels)
        lid = np.isin(e.water, nodes).any(axis=1)
        flux, potential = influences(
            e.points, e.hull[used], e.hull_table[used], self.images, points, components
        )
        if lid.any():
            on_top = self.images.of_surface_dipoles()
            potential += influences(
                e.points, e.water[lid], e.water_table[lid], on_top, points, components
            )[1]
        result = np.empty((len(flux), len(columns)))
        result[:, of_node] = potential[:, nodes]
        result[:, ~of_node] = flux[:, np.searchsorted(np.flatnonzero(used), panels)]
        return result.reshape(len(points), components, -1)

    def within_hulls(self, points: Array) -> Bools:
        """Whether each of points (n, 3) is inside a hull: by the solid angle it sees of it."""
        e = self.elements
        bed = make_images(self.sheet.depth, False)  # hulls may stand on it
        around = (bed.signs, bed.shifts, bed.weights)
        angle = np.zeros(len(points))
        for corners, table in ((e.hull, e.hull_table), (e.water, e.water_table)):
            if len(corners):
                seen = potential_at(points, table, corners, len(e.points), *around)[1]
                angle += seen.sum(axis=1)
        return np.abs(angle) > 0.5


class SurfaceSampler:
    """The solved surface at fixed places."""

    def __init__(self, samplers: GridSamplers, xy: Array) -> None:
        self._samplers, self._xy = samplers, xy

    def elevation(self, state: SurfaceState) -> Array:
        """(n,) [m]."""
        return self._value(state, "elevation")

    def elevation_rate(self, state: SurfaceState) -> Array:
        """(n,) vertical velocity of the surface [m/s]."""
        return self._value(state, "surface_flux")

    def elevation_acceleration(self, state: SurfaceState) -> Array:
        """(n,) vertical acceleration of the surface [m/s^2]."""
        return self._value(state, "surface_flux_rate")

    def velocity(self, state: SurfaceState) -> Array:
        """(n, 3) at z = 0 [m/s]."""
        plan = self._read(state, "potential", _SLOPES)
        return np.column_stack([*plan, self.elevation_rate(state)])

    def velocity_slope(self, state: SurfaceState) -> Array:
        """(n, 3) d(velocity)/dz at z = 0 [1/s]; by Laplace's equation from the surface alone."""
        plan = self._read(state, "surface_flux", _SLOPES)
        return np.column_stack([*plan, -self._read(state, "potential", _BENDS).sum(axis=0)])

    def potential_rate(self, state: SurfaceState) -> Array:
        """(n,) [m^2/s^2]."""
        return self._value(state, "potential_rate")

    def _value(self, state: SurfaceState, name: str) -> Array:
        value: Array = self._read(state, name, [_VALUE])[0]
        return value

    def _read(self, state: SurfaceState, name: str, orders: list[Order]) -> Array:
        return self._samplers.extension(state, name).at_surface(self._xy, orders)


class PointSampler:
    """The solved field at fixed points."""

    def __init__(self, samplers: GridSamplers, points: Array) -> None:
        self._samplers = samplers
        self._top = _near_still_water(samplers, points)
        self._z, self._strip = points[self._top, 2], samplers.strip
        self._surface = samplers.surface_sampler(points[self._top, :2])
        self._places = points.copy()
        self._places[self._top, 2] = -samplers.strip
        self._velocity_map: BlockMap | None = None
        self._potential_map: BlockMap | None = None

    def velocity(self, state: SurfaceState) -> Array:
        """(n, 3) [m/s]."""
        samplers = self._samplers
        if self._velocity_map is None:
            self._velocity_map = samplers.made_by_hulls(self._places, 3)
        result = samplers.extension(state, "potential").gradient(self._places)
        if self._velocity_map is not None:
            result += self._velocity_map @ np.append(state.hull_potential, state.hull_flux)
        surface = self._surface
        if len(self._z):
            self._bend(result, surface.velocity(state), surface.velocity_slope(state))
        return result

    def pressure(self, state: SurfaceState) -> Array:
        """(n,) dynamic pressure -rho d(phi)/dt [Pa]."""
        samplers = self._samplers
        if self._potential_map is None:
            self._potential_map = samplers.made_by_hulls(self._places, 1)
        rate = samplers.extension(state, "potential_rate").value(self._places)[:, None]
        if self._potential_map is not None:
            values = np.append(state.hull_potential_rate, state.hull_flux_rate)
            rate += self._potential_map @ values
        surface = self._surface
        if len(self._z):
            at_top = surface.potential_rate(state), surface.elevation_acceleration(state)
            self._bend(rate, at_top[0][:, None], at_top[1][:, None])
        return np.asarray(-samplers.density * rate[:, 0])

    def _bend(self, result: Array, value: Array, slope: Array) -> None:
        """Bring rows that hold the field a strip down up to their z, in place."""
        z = self._z[:, None]
        share = (z / self._strip) ** 2
        down = result[self._top]
        result[self._top] = share * down + (1.0 - share) * value + (z + self._strip * share) * slope


def _near_still_water(samplers: GridSamplers, points: Array) -> Ints:
    """Numbers of points in the strip under the surface, near hulls, with water a strip down."""
    top = np.flatnonzero(points[:, 2] > -samplers.strip)
    if not len(samplers.elements.hull) or not len(top):
        return top[:0]
    distance, _ = KDTree(samplers.elements.points).query(points[top])
    top = top[distance < REACH * samplers.sheet.spacing]
    below = points[top] * [1.0, 1.0, 0.0] - [0.0, 0.0, samplers.strip]
    return top[~samplers.within_hulls(below)]
