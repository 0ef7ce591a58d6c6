"""Bodies at rest on a grid, in steady waves of one period: what they make of these, and feel.

A quantity is the real part of its complex amplitude times exp(-i w t), so that it goes with
cos(phase - w t); incident waves have amplitude 1 m, and their elevation at the origin is cos(w t).
Modes are about a body's centre of mass, along its axes.

Linear theory about the mean wetted hull: no viscosity, no separation, no second order but the mean
drift. For design or operations these figures need qualified practice and the codes that apply.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt

from bemwave.bodies.loads import BodyLoads
from bemwave.bodies.modes import mode_shapes, panels_of
from bemwave.flow.grid import GridFlow
from bemwave.flow.sheet import Sheet
from bemwave.geometry.hull import Hull
from bemwave.geometry.waterplane import closed_bodies
from bemwave.kernels.panels import THREE
from bemwave.stepping.absorber import layer_for
from bemwave.stepping.at_frequency import AtFrequency
from bemwave.stepping.forcing import Ramp, ScatteredSea
from bemwave.stepping.run_up import at_waterlines
from bemwave.waves import Sea, depth_factors, group_speed, phase_speed, wavelength

Array = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]

DIRECTIONS = 2.0 * math.pi * np.arange(180) / 180  # over which waves sent out are summed [rad]


class BodiesOnGrid:
    """Bodies at rest on a grid.

    Parameters
    ----------
    hulls : the bodies in their places.
    sheet : the grid.
    useful : (2, 2) least and largest x, y of the water that is not damped [m]; the sheet reaches
        equally far beyond it on opposite sides.
    density, gravity : kg/m^3, m/s^2.
    """

    def __init__(
        self, hulls: Sequence[Hull], sheet: Sheet, useful: Array, density: float, gravity: float
    ) -> None:
        self.hulls, self.density, self.gravity = hulls, density, gravity
        mesh = closed_bodies(hulls)
        waterlines = [hull.polygons() for hull in hulls if hull.waterlines]
        self.flow = GridFlow(sheet, mesh, waterlines)
        e = self.flow.elements
        self.panels = [panels_of(e, mesh.part, number) for number in range(len(hulls))]
        self.shapes = np.hstack(
            [mode_shapes(e, panels, h) for panels, h in zip(self.panels, hulls, strict=True)]
        )
        self.rule = np.einsum("qj,mjc->mqc", THREE[:, :3], e.points[e.hull]).reshape(-1, 3)
        # distance into the absorber
        self.beyond = np.maximum(useful[0] - sheet.xy, sheet.xy - useful[1]).max(axis=1).clip(0.0)


class SteadyWaves:
    """Bodies in waves of one period.

    Parameters
    ----------
    bodies : on their grid.
    period : s.

    Attributes
    ----------
    layer : the absorber, with what returns from it of these waves.
    """

    def __init__(self, bodies: BodiesOnGrid, period: float) -> None:
        self.bodies, self.period = bodies, period
        self.frequency = 2.0 * math.pi / period
        sheet, g = bodies.flow.sheet, bodies.gravity
        length, width = float(wavelength(period, sheet.depth, g)), float(bodies.beyond.max())
        self.layer = layer_for(length, sheet.depth, g, sheet.spacing, width=width, behind="itself")
        damping = self.layer.rate(bodies.beyond)
        self.equation = AtFrequency(bodies.flow, g, self.frequency, damping)

    def added_mass_and_damping(self, motions: Sequence[int] | None = None) -> tuple[Array, Array]:
        """Both (6 n, motions), rows for loads: of all 6 n motions, or of some numbers of them.

        The load of a velocity v and an acceleration a is -(damping v + added mass a).
        """
        shapes = self.bodies.shapes if motions is None else self.bodies.shapes[:, list(motions)]
        made = [self.equation.solve(shape[:, None] + 0j)[1] for shape in shapes.T]
        load = self.loads_of(np.hstack(made), self.sea(0.0))
        return load.imag / self.frequency, -load.real

    def scattered(self, heading: float) -> Scattered:
        """What the bodies, held still, make of waves of a heading [rad]."""
        return Scattered(self, heading)

    def sea(self, heading: float) -> Sea:
        """The incident waves alone."""
        water = (self.bodies.flow.sheet.depth, self.bodies.density, self.bodies.gravity)
        return Sea.of([self.frequency], [heading], [1.0], [0.0], *water)

    def amplitude(self, record: Callable[[Array], Array]) -> Complex:
        """Complex amplitude of a field given at instants, (times,) -> (times, ...)."""
        real, imaginary = record(np.array([0.0, 0.25 * self.period]))
        return np.asarray(real + 1j * imaginary)

    def loads(self, sea: Sea) -> list[BodyLoads]:
        """Of each body."""
        bodies = self.bodies
        return [
            BodyLoads(bodies.flow.elements, panels, hull, sea)
            for panels, hull in zip(bodies.panels, bodies.hulls, strict=True)
        ]

    def loads_of(self, hull_potential: Complex, sea: Sea) -> Complex:
        """(6 n, k) of solved potentials at hull nodes (nodes, k)."""
        rate = -1j * self.frequency * hull_potential
        loads = self.loads(sea)
        return np.concatenate([b.solved(rate.real) + 1j * b.solved(rate.imag) for b in loads])


class Scattered:
    """Bodies held still in waves of one period and heading.

    Attributes
    ----------
    surface_potential, hull_potential : (nx ny,), (nodes,) of what they scatter [m^2/s].
    """

    def __init__(self, waves: SteadyWaves, heading: float) -> None:
        self._waves, self._heading, self._sea = waves, heading, waves.sea(heading)
        e = waves.bodies.flow.elements
        given = ScatteredSea(
            self._sea.at(waves.bodies.rule), e.hull_table[:, 9:12], THREE[:, 3], Ramp(0.0)
        )
        self.hull_flux = waves.amplitude(lambda times: given.flux(times).T)
        surface, hull = waves.equation.solve(self.hull_flux[:, None])
        self.surface_potential, self.hull_potential = surface[:, 0], hull[:, 0]

    def load(self) -> Complex:
        """(6 n,) of incident and scattered waves [N, N m]."""
        solved = self._waves.loads_of(self.hull_potential[:, None], self._sea)[:, 0]
        bodies = self._waves.loads(self._sea)
        incident = np.concatenate([self._waves.amplitude(body.incident) for body in bodies])
        return np.asarray(incident + solved)

    def at_waterlines(self) -> tuple[Array, Complex]:
        """Places (m, 2) of the nodes of waterlines, and the whole elevation there (m,) [m]."""
        waves = self._waves
        elements, rate = waves.bodies.flow.elements, waves.frequency**2 / waves.bodies.gravity
        at, potential = at_waterlines(elements, self.hull_potential, rate)
        incident = waves.amplitude(lambda times: self._sea.elevation(at[:, 0], at[:, 1], times))
        return at, incident + waves.equation.elevation(potential)

    def sent_out(self, directions: Array) -> Complex:
        """H (n,) [m]: far off the scattered elevation is sqrt(2/(pi k r)) exp(i(kr - pi/4)) H.

        By Green's theorem over the hulls, with waves that come from those directions [rad].
        """
        bodies = self._waves.bodies
        e, k = bodies.flow.elements, float(self._sea.wavenumber[0])
        at, normal = bodies.rule, np.repeat(e.hull_table[:, 9:12], 3, axis=0)
        weight = np.repeat(e.hull_table[:, 28] / 3.0, 3)
        potential = np.einsum("qj,mj->mq", THREE[:, :3], self.hull_potential[e.hull]).ravel()
        flux = np.repeat(self.hull_flux, 3)
        level, slope = depth_factors(k, at[:, 2], bodies.flow.sheet.depth)
        result = np.empty(len(directions), dtype=complex)
        for i, angle in enumerate(directions):
            along = np.array([math.cos(angle), math.sin(angle)])
            wave = np.exp(-1j * k * (at[:, :2] @ along))
            rate = k * (slope * normal[:, 2] - 1j * level * (normal[:, :2] @ along))
            result[i] = weight @ (wave * (potential * rate - flux * level))
        return np.asarray(result * k**2 / (4.0 * self._waves.frequency * self._speeds()))

    def mean_drift(self) -> Array:
        """(2,) mean horizontal force on all bodies together, along earth's axes [N].

        Momentum of the waves far off (Maruo 1960, J. Ship Res. 4(3):1, for any depth).
        """
        bodies, k = self._waves.bodies, float(self._sea.wavenumber[0])
        strength = np.abs(self.sent_out(DIRECTIONS)) ** 2

        def unit(angle: Array) -> Array:
            return np.stack([np.cos(angle), np.sin(angle)])

        turned = unit(np.array([self._heading])) - unit(DIRECTIONS)
        total = (turned * strength).mean(axis=1) * 2.0 * math.pi
        return np.asarray(bodies.density * bodies.gravity * self._speeds() / (math.pi * k) * total)

    def _speeds(self) -> float:
        """Group speed over the speed of crests."""
        water = (
            self._waves.period,
            self._waves.bodies.flow.sheet.depth,
            self._waves.bodies.gravity,
        )
        return float(group_speed(*water) / phase_speed(*water))
