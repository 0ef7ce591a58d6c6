"""A case solved step by step with nothing written: for coupling live to another solver."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import numpy.typing as npt

from bemwave.case import Case
from bemwave.flow.state import SurfaceState
from bemwave.geometry.inside import inside
from bemwave.handoff import HandoffSampler, free_points
from bemwave.running.budget import refuse_too_large
from bemwave.running.solution import STEPS_PER_PERIOD, Solution, nothing_solved, products
from bemwave.running.survey import Survey, survey

Array = npt.NDArray[np.float64]


class LiveState:
    """The total field at one step, for coupling live.

    Attributes
    ----------
    time : s.
    solved : the solved part.
    """

    def __init__(self, field: LiveField, solved: SurfaceState) -> None:
        self.time, self.solved, self._field = solved.time, solved, field

    def velocity(self, points: npt.ArrayLike) -> Array:
        """Total velocity (n, 3) at points (n, 3) [m/s]; NaN above the water and in hulls."""
        sampler = self._field.sampler(np.asarray(points, dtype=np.float64).reshape(-1, 3))
        return sampler.at(self.solved).total.velocity

    def elevation(self, x: npt.ArrayLike, y: npt.ArrayLike) -> Array:
        """Total elevation at places that broadcast [m]; NaN inside waterlines."""
        at_x, at_y = np.broadcast_arrays(np.asarray(x, float), np.asarray(y, float))
        plan = np.column_stack([at_x.ravel(), at_y.ravel(), np.zeros(at_x.size)])
        sampler = self._field.sampler(plan)
        column = free_points(plan).column
        return sampler.elevation(self.solved)[column].reshape(at_x.shape)


class LiveField:
    """Keeps the samplers of places asked for again and again."""

    def __init__(self, surveyed: Survey, solution: Solution | None) -> None:
        self._surveyed = surveyed
        self._flow = None if solution is None else solution.samplers()
        self._samplers: dict[bytes, HandoffSampler] = {}

    def sampler(self, points: Array) -> HandoffSampler:
        """The sampler at points (n, 3), the last few kept."""
        key = points.tobytes()
        if key not in self._samplers:
            if len(self._samplers) == 4:
                self._samplers.pop(next(iter(self._samplers)))
            self._samplers[key] = HandoffSampler(
                free_points(points),
                self._surveyed.sea,
                self._flow,
                solid=self._solid,
            )
        return self._samplers[key]

    def _solid(self, points: Array) -> npt.NDArray[np.bool_]:
        """Which points (n, 3) lie inside hulls, or straight over their waterplanes."""
        within = np.zeros(len(points), dtype=bool)
        for hull in self._surveyed.hulls:
            within |= inside(hull.mesh, points)
        return within


def steps(case: Case) -> Iterator[LiveState]:
    """Solve a case step by step, writing nothing: for coupling live.

    Yields
    ------
    LiveState
        At every step, from t = 0 to the case's duration.

    Examples
    --------
    >>> for state in bemwave.steps(case):                        # doctest: +SKIP
    ...     u = state.velocity([[0.0, 0.0, -1.0]])
    """
    surveyed = survey(case)
    refuse_too_large(surveyed)
    with products(surveyed):
        solution = None if surveyed.mesh is None else Solution(surveyed)
    field = LiveField(surveyed, solution)
    step = solution.step if solution is not None else _sea_step(surveyed)
    count = int(np.floor(case.run.duration / step + 1e-9))
    for time in step * np.arange(count + 1):
        if solution is None:
            yield LiveState(field, nothing_solved(float(time)))
            continue
        with products(surveyed):
            solution.advance_to(float(time))
            state = solution.state(float(time))
        yield LiveState(field, state)


def _sea_step(surveyed: Survey) -> float:
    """Between states of a case in which the sea is all there is [s]."""
    steps = STEPS_PER_PERIOD[surveyed.route[0]]
    return min(surveyed.periods.kept / steps, surveyed.case.run.record_every)
