"""The solved field of a surveyed case: assembled once, then advanced and read off at times."""

from __future__ import annotations

import math
from collections.abc import Callable
from contextlib import AbstractContextManager, nullcontext
from functools import cache

import numpy as np
import numpy.typing as npt
from threadpoolctl import ThreadpoolController

from bemwave.bodies.loads import BodyLoads
from bemwave.bodies.modes import panels_of, stiffness
from bemwave.errors import InputError
from bemwave.flow.exact import LARGEST_TURN
from bemwave.flow.grid import GridFlow
from bemwave.flow.grid_samplers import GridSamplers
from bemwave.flow.panels import PanelFlow
from bemwave.flow.samplers import PanelSamplers
from bemwave.flow.state import ARRAYS, SurfaceState
from bemwave.running.driving import Driving, driving, released_elevation
from bemwave.running.survey import Survey
from bemwave.stepping.stepper import Stepper

Array = npt.NDArray[np.float64]

# of the shortest waves solved, by route: common practice, no source; free waves are exact in time
STEPS_PER_PERIOD = {"panels": 40, "grid": 30}


class Solution:
    """Advances the solved field of a case and tells its state, loads and energy.

    Parameters
    ----------
    survey : with something to solve.
    progress : called with the share of the assembly done.
    """

    def __init__(
        self, survey: Survey, progress: Callable[[float], None] = lambda share: None
    ) -> None:
        assert survey.mesh is not None
        self.survey = survey
        water = survey.case.water
        self.flow = _flow(survey, lambda share: progress(0.8 * share))
        self.driving: Driving = driving(survey, self.flow.elements)
        self.step = self._choose_step()
        self.damping = None
        if survey.layer is not None:
            layer = survey.layer
            self.damping = self.flow.damping(
                lambda xy: layer.rate(np.minimum(survey.outside(xy), layer.width))
            )
        self.stepper = Stepper(
            self.flow,
            water.gravity,
            self.step,
            list(self.driving.parts.values()),
            patches=self.driving.patches,
            damping=self.damping,
            elevation=self._released(),
            precision=np.float32 if survey.case.run.precision == "single" else np.float64,
        )
        self._loads = [self._loads_on(number) for number in range(len(survey.hulls))]
        progress(1.0)

    def _released(self) -> Array | None:
        """The surface of the humps let go at t = 0 [m]."""
        humps = self.survey.case.hump
        return self.flow.nodal(lambda xy: released_elevation(humps, xy)) if humps else None

    def _choose_step(self) -> float:
        """A share of the shortest period solved, within what the mesh's own waves allow."""
        gravity, asked = self.survey.case.water.gravity, self.survey.case.run.step
        longest = LARGEST_TURN / self.flow.fastest(gravity)
        if asked != "auto":
            if float(asked) > longest:
                raise InputError(
                    f"[run] step = {asked:g} s is longer than this mesh allows; expected at most "
                    f'{longest:.4g} s: write that, or step = "auto"'
                )
            return float(asked)
        step = min(longest, self.survey.periods.shortest / STEPS_PER_PERIOD[self.survey.route[0]])
        duration = self.survey.case.run.duration
        return duration / math.ceil(duration / step)

    def _loads_on(self, number: int) -> BodyLoads:
        mesh, hull = self.survey.mesh, self.survey.hulls[number]
        assert mesh is not None
        panels = panels_of(self.flow.elements, mesh.part, mesh.part_names.index(hull.name))
        return BodyLoads(self.flow.elements, panels, hull, self.survey.scattered)

    def samplers(self) -> PanelSamplers | GridSamplers:
        """Samplers of the field at places."""
        survey, water = self.survey, self.survey.case.water
        if survey.sheet is not None:
            return GridSamplers(survey.sheet, self.flow.elements, density=water.density)
        assert survey.mesh is not None
        return PanelSamplers(
            survey.mesh,
            water.depth,
            closed=survey.closed,
            mirrors=survey.mirrors,
            density=water.density,
        )

    def advance_to(self, time: float) -> None:
        """Take the steps after which the field at a time [s] is known."""
        while not self.stepper.ready(time):
            self.stepper.advance()

    def state(self, time: float) -> SurfaceState:
        """The solved field at a time just reached by `advance_to`."""
        return self.stepper.state(time)

    def motions(self, time: float) -> tuple[Array, Array]:
        """Displacements and velocities of the bodies at their centres of mass, (bodies, 6)."""
        at = np.array([time])
        place, speed = np.zeros((2, len(self.survey.hulls), 6))
        for body, row in enumerate(self.driving.motions):
            for mode, motion in enumerate(row):
                if motion is not None:
                    place[body, mode] = motion.displacement(at)[0]
                    speed[body, mode] = motion.velocity(at)[0]
        return place, speed

    def loads(self, time: float) -> dict[str, Array]:
        """Loads on the bodies (bodies, 6), named as in bodies.nc [N, N m]."""
        shape = (len(self.survey.hulls), 6)  # none, where all there is rides a hump's waves
        loads = {f"force_{part}": np.zeros(shape) for part in ("scattered", "radiated")}
        if self.driving.parts:
            rate = self.stepper.wetted_parts(time)
            for k, part in enumerate(self.driving.parts):
                solved = [load.solved(rate[:, k]) for load in self._loads]
                loads[f"force_{part}"] = np.reshape(solved, shape)
        at = np.array([time])
        incident = [load.incident(at)[0] for load in self._loads]
        loads["force_incident"] = np.reshape(incident, shape)
        water, motion = self.survey.case.water, self.motions(time)[0]
        restoring = [
            stiffness(hull, water.density, water.gravity) @ displaced
            for hull, displaced in zip(self.survey.hulls, motion, strict=True)
        ]
        loads["force_restoring"] = -np.reshape(restoring, shape)
        loads["force"] = sum(loads.values(), np.zeros(shape))
        return loads

    def energy(self, state: SurfaceState) -> tuple[float, float, float]:
        """Energy of the solved field [J], power put into it, and power the absorber takes [W].

        Energy 1/2 rho int (g eta^2 over the surface + phi d(phi)/dn over all boundaries); power
        rho int d(phi)/dt d(phi)/dn over hulls and walls, less that of pressure patches. The account
        is of pressures and velocities, not of the scheme's own maps, so it closes as well as these
        agree: to half a per cent on ordinary panels.
        """
        water, elements, mass = self.survey.case.water, self.flow.elements, self.flow.mass
        density, gravity = water.density, water.gravity
        eta, potential = state.elevation, state.potential
        rise: Array = np.asarray(mass @ state.surface_flux)
        energy = float(gravity * eta @ np.asarray(mass @ eta) + potential @ rise)
        with_head = -state.potential_rate / gravity
        power = float(gravity * (eta - with_head) @ rise)
        if len(elements.hull):
            shares = elements.shares(elements.hull, elements.hull_table)
            through = shares.T @ state.hull_flux
            at_nodes = self.flow.at_nodes
            energy += float(through @ at_nodes(potential, state.hull_potential))
            power += float(through @ at_nodes(state.potential_rate, state.hull_potential_rate))
        taken = 0.0 if self.damping is None else gravity * eta @ (self.damping @ with_head)
        return 0.5 * density * energy, density * power, density * float(taken)


def _flow(survey: Survey, progress: Callable[[float], None]) -> PanelFlow | GridFlow:
    """The flow map of the case's route."""
    assert survey.mesh is not None
    if survey.sheet is not None:
        waterlines = [hull.polygons() for hull in survey.hulls if hull.waterlines]
        return GridFlow(survey.sheet, survey.mesh, waterlines, progress)
    return PanelFlow(
        survey.mesh,
        survey.case.water.depth,
        closed=survey.closed,
        mirrors=survey.mirrors,
        progress=progress,
    )


def products(survey: Survey) -> AbstractContextManager[object]:
    """While it lasts, dense products are made on one thread if the route is the grid.

    Its products are too small to gain by more, and on a machine that does other work as well each
    would wait for the busier core.
    """
    if survey.sheet is None:
        return nullcontext()
    one: AbstractContextManager[object] = _libraries().limit(limits=1, user_api="blas")
    return one


@cache
def _libraries() -> ThreadpoolController:
    return ThreadpoolController()


def nothing_solved(time: float) -> SurfaceState:
    """The state of a case in which the sea is all there is."""
    return SurfaceState(time, **{name: np.zeros(0) for name in ARRAYS})
