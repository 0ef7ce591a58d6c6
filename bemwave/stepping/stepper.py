"""Steps of the free-surface conditions d(eta)/dt = w - nu eta, d(phi)/dt = -g (eta + head).

Leapfrog on the exact map of a step: the unknown beside phi_n is the step's mean E of eta + head,

    E(n+1/2) = E(n-1/2) + dt [A_dt (phi_n - (g dt^2/12) f_n) + f_n]
    phi_n+1 = phi_n - g dt E(n+1/2)

f_n being the surface flux of the given fluxes and the head's rate, smoothed over the step as
Numerov does (f_n + (f_n+1 - 2 f_n + f_n-1)/12): free waves are exact, forced ones right to the
fourth order. The absorber takes nu (E(n+1/2) + E(n-1/2))/2 from the rate, in the weak form
int nu hat hat: the steps' energy (E'ME g + phi_n' M A_dt phi_n+1)/2 then only falls, by
g dt (E+E)' D (E+E)/4, D the weak form. One dense product a step.

Between and at steps the state is read off the polynomial through eight successive phi: that gives
phi and, by its slope, eta = -d(phi)/dt / g - head; fluxes and hull potentials then follow from the
flow map. The columns of phi are parts of the solved field kept apart (scattered, radiated).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Protocol

import numpy as np
import numpy.typing as npt
from scipy import sparse

from bemwave.flow.elements import Elements
from bemwave.flow.state import ARRAYS, SurfaceState
from bemwave.stepping.forcing import GivenFlux, PressurePatch

Array = npt.NDArray[np.float64]

STENCIL = 8
BLOCK = 32  # steps whose given fluxes are worked out together, as one matrix product
START_TERMS = 12  # of the series of sin(x)/x for x <= LARGEST_TURN, to 1e-16


class March(Protocol):
    """Steps of one length; fields have a column for each part of the solved field."""

    def given(self, fluxes: Sequence[Array]) -> Array:
        """What `flux` needs of the parts' given flux (triangles, times), by time."""

    def flux(self, potential: Array, given: Array) -> Array:
        """Mean surface flux of a step from the potential in its middle [m/s]."""

    def damped(self, flux: Array, mean: Array) -> Array:
        """The flux less what the absorber takes of the mean elevation [m/s]."""


class Flow(Protocol):
    """What a route gives to the stepper; see `flow.panels` and `flow.grid`."""

    elements: Elements

    @property
    def places(self) -> Array:
        """(n, 2) where the surface's values stand [m]."""

    def march(self, gravity: float, step: float, damping: sparse.csc_matrix | None) -> March:
        """Steps of a length [s]."""

    def surface_flux(self, potential: Array, hull_flux: Array) -> Array:
        """Vertical velocity of the surface (n, k) [m/s]."""

    def both(self, potential: Array, hull_flux: Array) -> tuple[Array, Array]:
        """That, and the potential at hulls and walls (b, k) [m^2/s]."""

    def at_nodes(self, surface: Array, hull: Array) -> Array:
        """A field of the surface and of hulls, at the nodes of `elements`."""


class Stepper:
    """Advances the solved field step by step.

    Parameters
    ----------
    flow : the flow map.
    gravity, step : m/s^2, s; `step` at most exact.LARGEST_TURN over the fastest frequency.
    parts : the given flux of each part of the field.
    patches : pressure patches; they belong to the first part.
    damping : (free, free) sparse int nu hat hat [m^2/s], or None.
    elevation : (free,) at t = 0, of the first part, at rest; None: still water.
    precision : of the state that is kept; the grid's transforms are made in the same.
    """

    def __init__(
        self,
        flow: Flow,
        gravity: float,
        step: float,
        parts: Sequence[GivenFlux],
        *,
        patches: Sequence[PressurePatch] = (),
        damping: sparse.csc_matrix | None = None,
        elevation: Array | None = None,
        precision: type[np.floating[Any]] = np.float64,
    ) -> None:
        self.flow, self.gravity, self.step, self.parts = flow, gravity, step, parts
        self.patches = patches
        self._xy = flow.places
        self._march = flow.march(gravity, step, damping)
        self.count = 0
        # each part in one piece: so routes take and give them
        shape = (len(self._xy), max(1, len(parts)))
        self._potentials = [np.zeros(shape, dtype=precision, order="F")]
        self._mean = self._first_mean(elevation)
        self._given: Array = np.empty((0, 0, 0))
        self._heads: Array = np.empty((0, 0))
        self._block_from = -1
        self._latest: tuple[float, int, SurfaceState] | None = None

    def _first_mean(self, elevation: Array | None) -> Array:
        """E(-1/2) of the free motion from rest, which is even in time."""
        mean = np.zeros_like(self._potentials[0])
        start = self._head(0.0) if elevation is None else elevation + self._head(0.0)
        if start.any():
            # the mean of cos(w t) over a step is sin(x)/x, x = w dt: a series in Y = g dt^2 A
            turn, term = self.gravity * self.step**2, start[:, None]
            still = np.zeros((len(self.flow.elements.hull), 1))
            for k in range(START_TERMS):
                mean[:, :1] += term
                image = self.flow.surface_flux(term, still)
                term = -turn / ((2 * k + 2) * (2 * k + 3)) * image
        return mean

    @property
    def time(self) -> float:
        """Time of the latest potential [s]."""
        return self.count * self.step

    def advance(self) -> None:
        """One step."""
        potential, g, dt = self._potentials[-1], self.gravity, self.step
        start = self.count - self.count % BLOCK
        # blocks start at multiples of BLOCK, so that a resumed run has the very same ones
        if self._block_from != start:
            self._begin_block(start)
        given = self._given[self.count - start]
        if self.patches:
            head = self._heads[self.count - start]
            moving = potential.copy(order="F")
            moving[:, 0] -= g * dt**2 / 12.0 * head
            flux = self._march.flux(moving, given)
            flux[:, 0] += head
        else:
            flux = self._march.flux(potential, given)
        if self.count == 0:
            flux *= 0.5  # what is given begins at t = 0: the first step sees half a stencil
        # in place: on a large grid new arrays cost as much as what is done with them
        rate = self._march.damped(flux, self._mean)
        rate *= dt
        self._mean += rate
        full = len(self._potentials) == STENCIL
        moved = self._potentials.pop(0) if full else np.empty_like(potential)
        np.multiply(self._mean, -g * dt, out=moved)
        moved += potential
        self._potentials.append(moved)
        self.count += 1

    def _begin_block(self, start: int) -> None:
        """What is given in the next steps, smoothed over each."""
        times: Array = (start + np.arange(-1.0, BLOCK + 1)) * self.step
        fluxes = [_smoothed(part.flux(times), start) for part in self.parts]
        if not fluxes:
            fluxes = [np.zeros((len(self.flow.elements.hull), BLOCK))]
        self._given, self._block_from = self._march.given(fluxes), start
        if self.patches:
            rates = np.column_stack([self._head_rate(time) for time in times])
            self._heads = _smoothed(rates, start).T

    def _head(self, time: float) -> Array:
        return sum((p.value(self._xy, time) for p in self.patches), np.zeros(len(self._xy)))

    def _head_rate(self, time: float) -> Array:
        return sum((p.rate(self._xy, time) for p in self.patches), np.zeros(len(self._xy)))

    def ready(self, time: float) -> bool:
        """Whether enough steps were taken for `state(time)`; ask as soon as it is."""
        after = STENCIL // 2 - 1
        return self.count >= STENCIL - 1 and time <= (self.count - after + 1e-9) * self.step

    def history(self) -> dict[str, Array]:
        """What `restore` needs to go on bit for bit, beside the count of steps.

        These are the stepper's own arrays, and change with its next step.
        """
        kept = {f"potential {n}": potential for n, potential in enumerate(self._potentials)}
        return {**kept, "mean": self._mean}

    def restore(self, history: dict[str, Array], count: int) -> None:
        """Go back to where `history()` was taken, after `count` steps."""
        kept = [history[f"potential {n}"] for n in range(len(history) - 1)]
        self._potentials = [np.array(potential, order="F") for potential in kept]
        self._mean, self.count = np.array(history["mean"], order="F"), count

    def parts_at(self, time: float) -> tuple[Array, Array]:
        """Potential and its rate (free, parts) at any time among the kept steps."""
        first = self.count - len(self._potentials) + 1
        value, slope = _lagrange(time / self.step - first, len(self._potentials))
        potential = sum(w * p for w, p in zip(value, self._potentials, strict=True))
        rate = sum(w * p for w, p in zip(slope, self._potentials, strict=True))
        return np.asarray(potential), np.asarray(rate) / self.step

    def wetted_parts(self, time: float) -> Array:
        """Potential rate at the nodes of hulls (nodes, parts): each part's, for its loads."""
        at = self._parts_of(time)
        return self.flow.at_nodes(at.potential_rate, at.hull_potential_rate)

    def state(self, time: float) -> SurfaceState:
        """The solved field, its parts added, at any time among the kept steps."""
        parts = self._parts_of(time)
        whole = {name: getattr(parts, name).sum(axis=1) for name in ARRAYS}
        whole["elevation"] -= self._head(time)
        return SurfaceState(time, **whole)

    def _parts_of(self, time: float) -> SurfaceState:
        """Each part's field in a column, but for pressure heads; the latest is kept."""
        if self._latest is None or self._latest[:2] != (time, self.count):
            potential, rate = self.parts_at(time)
            at, shape = np.array([time]), (len(self.flow.elements.hull), potential.shape[1])
            flux, flux_rate = np.zeros(shape), np.zeros(shape)
            for k, part in enumerate(self.parts):
                flux[:, k], flux_rate[:, k] = part.flux(at)[:, 0], part.rate(at)[:, 0]
            surface, hull = self.flow.both(
                np.hstack([potential, rate]), np.hstack([flux, flux_rate])
            )
            k = potential.shape[1]
            state = SurfaceState(
                time=time,
                elevation=-rate / self.gravity,
                potential=potential,
                potential_rate=rate,
                surface_flux=surface[:, :k],
                surface_flux_rate=surface[:, k:],
                hull_potential=hull[:, :k],
                hull_potential_rate=hull[:, k:],
                hull_flux=flux,
                hull_flux_rate=flux_rate,
            )
            self._latest = time, self.count, state
        return self._latest[2]


def _smoothed(values: Array, start: int) -> Array:
    """Numerov's mean over steps of columns -1 ... BLOCK; from t = 0 on alone at the very start."""
    smooth = values[:, 1:-1] + np.diff(values, 2, axis=1) / 12.0
    if start == 0:
        # what moves phi in the first step: f + dt f'/3 + dt^2 f''/12
        smooth[:, 0] = (7.0 * values[:, 1] + 6.0 * values[:, 2] - values[:, 3]) / 12.0
    return np.asarray(smooth)


def _lagrange(at: float, count: int) -> tuple[Array, Array]:
    """Weights of the value and slope at `at` of the polynomial through 0, 1 ... count - 1."""
    nodes = np.arange(count)
    powers = np.vander(nodes - at, count, increasing=True).T
    wanted = np.zeros((count, 2))
    wanted[0, 0] = 1.0
    wanted[1, 1] = 1.0
    weights = np.linalg.solve(powers, wanted)
    return weights[:, 0], weights[:, 1]
