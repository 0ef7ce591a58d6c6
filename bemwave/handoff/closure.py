"""Does the box close? What flows through its faces against what its surface takes up.

First order, as linear theory means it: flux through the faces up to still water, against the
vertical velocity of the surface over the box's plan, a body's waterplane counted with the body's.
The flux above still water is of second order and told apart.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from bemwave.flow.state import SurfaceState
from bemwave.handoff.box import BOX_FACES, Array, Box, PointSet, turn
from bemwave.handoff.fields import Flow, on_surface
from bemwave.handoff.plan import Waterplane, waterplane_quadrature
from bemwave.handoff.sampler import Instant
from bemwave.waves import Sea


@dataclass(frozen=True)
class ClosureInstant:
    """The box's balance at one time, m3/s.

    Attributes
    ----------
    net_flux : out through all faces up to z = 0.
    volume_rate : growth of the volume under the surface.
    largest_face_flux : the largest, in size, of the fluxes through single faces.
    wet_excess : what the wet cells let out in total, at the velocities handed over, less net_flux.
    level_drift : m/s, rise of the mean level that wet_excess implies.
    """

    net_flux: float
    volume_rate: float
    largest_face_flux: float
    wet_excess: float
    level_drift: float


class Closure:
    """Balance of a box.

    Parameters
    ----------
    box, points : Box, PointSet
        `points` from `box_points(box)`.
    sea : Sea
    flow : Flow or None
    surface : callable
        Points (n, 2) and weights, m2, that integrate over the solved water in a box.
    waterplanes : sequence of Waterplane
        One for each body that pierces the surface.
    kept_out : Sea, optional
        The waves that bodies keep out of their waterplanes; by default the whole sea.
    share : callable, optional
        The share of them kept out at a time: less than 1 during a start-up.
    """

    def __init__(
        self,
        box: Box,
        points: PointSet,
        sea: Sea,
        flow: Flow | None,
        surface: Callable[[Box], tuple[Array, Array]],
        waterplanes: Sequence[Waterplane] = (),
        kept_out: Sea | None = None,
        share: Callable[[float], float] = lambda time: 1.0,
    ) -> None:
        self._area = box.area
        self._faces = np.flatnonzero(points.face < len(BOX_FACES))
        self._face = points.face[self._faces]
        self._outward = points.normals[self._faces] * points.area[self._faces, None]
        self._surface: list[_SurfaceRate] = []
        self._planes: list[_WaterplaneRate] = []
        # a box whose top is under water has no surface of its own: all its faces count
        if box.top > 0.0:
            self._surface.append(_IncidentRate(sea, box))
            waves = sea if kept_out is None else kept_out
            self._planes = [_WaterplaneRate(waves, box, plane, share) for plane in waterplanes]
            if flow is not None:
                self._surface.append(_SolvedRate(flow, *surface(box)))

    def at(
        self, instant: Instant, state: SurfaceState, bodies: Array | None = None
    ) -> ClosureInstant:
        """Balance at an instant of the hand-off.

        Parameters
        ----------
        instant, state : the sampled field and the solved state it came from.
        bodies : (waterplanes, 6), optional
            Velocity of each waterplane's body along and about its own axes, m/s and rad/s, at the
            reference; None where all are at rest.
        """
        flux = self._flux(instant.first_order)
        by_face = np.bincount(self._face, flux, minlength=len(BOX_FACES))
        rate = self._volume_rate(state, bodies)
        wet = instant.wet[self._faces]
        handed = np.where(wet > 0.0, self._flux(instant.total.velocity), 0.0)
        excess = float(wet @ handed - flux.sum())
        return ClosureInstant(
            net_flux=float(flux.sum()),
            volume_rate=rate,
            largest_face_flux=float(np.abs(by_face).max()),
            wet_excess=excess,
            level_drift=-excess / self._area,
        )

    def _flux(self, velocity: Array) -> Array:
        flux: Array = np.einsum("pd,pd->p", velocity[self._faces], self._outward)
        return flux

    def _volume_rate(self, state: SurfaceState, bodies: Array | None) -> float:
        # without a surface, or of the incident waves alone, no waterplane counts
        moved = np.zeros((len(self._planes), 6)) if bodies is None else bodies[: len(self._planes)]
        surface = sum(part.at(state) for part in self._surface)
        planes = sum(p.at(state, v) for p, v in zip(self._planes, moved, strict=True))
        return float(surface + planes)


class _SurfaceRate(Protocol):
    def at(self, state: SurfaceState) -> float: ...


class _IncidentRate:
    """Integral of the sea's d(elevation)/dt over a rectangle, wave by wave in closed form.

    For one wave it is the value at the centre times the area and sin(q)/q along each axis,
    q = half the side times the wavenumber along it.
    """

    def __init__(self, sea: Sea, box: Box) -> None:
        along = sea.wavenumber * np.cos(sea.heading - box.angle)
        across = sea.wavenumber * np.sin(sea.heading - box.angle)
        share = np.sinc(along * box.size[0] / (2 * np.pi)) * np.sinc(
            across * box.size[1] / (2 * np.pi)
        )
        east, north = np.cos(sea.heading) * box.centre[0], np.sin(sea.heading) * box.centre[1]
        self._phase = sea.wavenumber * (east + north) + sea.phase
        self._size = box.area * share * sea.amplitude * sea.frequency
        self._frequency = sea.frequency

    def at(self, state: SurfaceState) -> float:
        return float(self._size @ np.sin(self._phase - self._frequency * state.time))


class _SolvedRate:
    """Integral of the solved d(elevation)/dt over the water inside the box."""

    def __init__(self, flow: Flow, points: Array, weights: Array) -> None:
        self._weights = weights
        self._surface = flow.surface_sampler(points)

    def at(self, state: SurfaceState) -> float:
        return float(self._weights @ self._surface.elevation_rate(state))


class _WaterplaneRate:
    """A body's own vertical velocity over its waterplane, in place of the sea it keeps out."""

    def __init__(
        self, sea: Sea, box: Box, plane: Waterplane, share: Callable[[float], float]
    ) -> None:
        self._share = share
        points, self._weights = waterplane_quadrature(box, plane)
        self._sea = sea.at(on_surface(points))
        arm = (points - plane.reference) @ turn(plane.heading)
        ones = np.ones(len(points))
        # vertical velocity = heave + roll y - pitch x
        self._moments = self._weights @ np.column_stack([ones, arm[:, 1], -arm[:, 0]])

    def at(self, state: SurfaceState, body: Array) -> float:
        incident = self._share(state.time) * (self._weights @ self._sea.elevation_rate(state.time))
        return float(self._moments @ body[2:5] - incident)


def closure_figure(net_flux: Array, volume_rate: Array, largest_face_flux: Array) -> float:
    """Largest imbalance over all instants, as a share of the largest face flux."""
    return share_of_largest(net_flux + volume_rate, largest_face_flux)


def share_of_largest(part: Array, whole: Array) -> float:
    """Largest size in `part` over the largest in `whole`; 0 where there is nothing at all."""
    largest = float(np.max(np.abs(whole), initial=0.0))
    return float(np.max(np.abs(part), initial=0.0)) / largest if largest > 0.0 else 0.0
