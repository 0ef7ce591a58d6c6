"""What stops a run at once: a field that is no longer a number, or that grows without a source."""

from __future__ import annotations

import numpy as np

from bemwave.errors import RunError
from bemwave.flow.state import SurfaceState
from bemwave.running.solution import Solution

ALLOWED = 4.0  # times what was there and put in: room for coarse instants, none for a blow-up
NOTHING = 1e-6  # J: less is rounding

_ADVICE = (
    "what was written before is whole; check the mesh with bemwave plan, or start anew with a "
    "smaller [run] step"
)


def where(solution: Solution | None) -> str:
    """How far a run has come, for messages."""
    if solution is None:
        return "(nothing is solved, the sea alone)"
    return f"at step {solution.stepper.count}, t = {solution.stepper.time:.6g} s"


def refuse_no_numbers(state: SurfaceState, solution: Solution | None) -> None:
    """Raise RunError if the elevation is not finite."""
    if not np.isfinite(state.elevation).all():
        raise RunError(
            f"the elevation is no longer a number {where(solution)}; expected it finite: {_ADVICE}"
        )


class GrowthGuard:
    """Compares the energy of the solved field with all that was ever put in, at every instant."""

    def __init__(self, solution: Solution) -> None:
        self._solution = solution
        self._time, self._power = 0.0, 0.0
        self._source: float | None = None  # J, there at first or put in since

    def check(self, time: float, energy: float, power_in: float) -> None:
        """Take the next instant: s, J, W.

        Raises
        ------
        RunError
            If there is far more energy than the start and the sources account for.
        """
        if self._source is None:
            self._source = NOTHING + abs(energy)
        else:
            self._source += 0.5 * (abs(self._power) + abs(power_in)) * (time - self._time)
        self._time, self._power = time, power_in
        if not energy <= ALLOWED * self._source:
            raise RunError(
                f"the energy of the solved waves grew to {energy:.3g} J {where(self._solution)}, "
                f"and only {self._source:.3g} J were there or put in; expected no more than that: "
                f"{_ADVICE}"
            )
