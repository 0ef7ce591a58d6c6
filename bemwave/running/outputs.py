"""What a run writes while it goes: each output has its own times and takes states at them."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Protocol

import numpy as np
import numpy.typing as npt

from bemwave.flow.grid_samplers import GridSamplers
from bemwave.flow.samplers import PanelSamplers
from bemwave.flow.state import SurfaceState
from bemwave.geometry.inside import inside
from bemwave.handoff import Handoff, Scene
from bemwave.handoff.netcdf import SeriesFile
from bemwave.records import BodiesFile, GaugesFile, HistoryFile, RunFolder
from bemwave.records.energy import EnergyFile, Ledger, read_energy
from bemwave.running.budget import instants_between
from bemwave.running.driving import start_up
from bemwave.running.faults import GrowthGuard
from bemwave.running.frames_output import FramesOutput
from bemwave.running.riding import Rider
from bemwave.running.solution import Solution
from bemwave.running.survey import Survey

Array = npt.NDArray[np.float64]


class Output(Protocol):
    """One output of a run."""

    times: Array

    @property
    def count(self) -> int:
        """Number of instants written so far."""

    def write(self, state: SurfaceState) -> None:
        """Write the instant `times[count]`."""

    def flush(self) -> None:
        """Put every instant written so far on the disk."""


class _FileOutput:
    """An output into a file of records."""

    _file: SeriesFile

    @property
    def count(self) -> int:
        """See `Output`."""
        return self._file.count

    def flush(self) -> None:
        """See `Output`."""
        self._file.flush()


class HistoryOutput(_FileOutput):
    """history.nc, at every record."""

    _file: HistoryFile

    def __init__(self, solution: Solution, folder: RunFolder, keep: int | None) -> None:
        run = solution.survey.case.run
        self.times = np.linspace(0.0, run.duration, round(run.duration / run.record_every) + 1)
        flow = solution.flow
        panels = flow.elements.hull_table[:, 24:27]
        self._part = recorded(solution.survey)
        nodes = flow.places if self._part is None else flow.places[self._part]
        places = np.column_stack([nodes, np.zeros(len(nodes))])
        self._file = HistoryFile(folder.history, self.times, places, flow.hull_places, panels, keep)

    def write(self, state: SurfaceState) -> None:
        """See `Output`."""
        self._file.add(state if self._part is None else state.at(self._part))


class EnergyOutput(_FileOutput):
    """energy.nc."""

    _file: EnergyFile

    def __init__(self, solution: Solution, folder: RunFolder, keep: int | None) -> None:
        self.times = fine_times(solution.survey)
        self._solution = solution
        self._file = EnergyFile(folder.energy, self.times, keep)
        kept = read_energy(folder.energy)
        columns = (kept.times, kept.energy, kept.power_in, kept.power_absorbed)
        self._rows = list(zip(*columns, strict=True))
        self._guard = GrowthGuard(solution)
        for time, energy, power_in, _ in self._rows:
            self._guard.check(time, energy, power_in)

    @property
    def figure(self) -> str:
        """The energy as it stands, for whoever waits."""
        ledger = Ledger(*np.array(self._rows).T)
        missing = 100.0 * float(np.abs(ledger.missing).max())
        return f"energy {ledger.energy[-1]:.3g} J, {missing:.2g} % missing"

    def write(self, state: SurfaceState) -> None:
        """See `Output`."""
        energy, power_in, absorbed = self._solution.energy(state)
        self._guard.check(state.time, energy, power_in)
        self._rows.append((state.time, energy, power_in, absorbed))
        self._file.add(*self._rows[-1])


class BodiesOutput(_FileOutput):
    """bodies.nc: the bodies that the water flows round, then those that ride it, without loads."""

    _file: BodiesFile

    def __init__(
        self,
        survey: Survey,
        solution: Solution | None,
        riders: Sequence[Rider],
        folder: RunFolder,
        keep: int | None,
    ) -> None:
        self.times = fine_times(survey)
        self._solution, self._riders = solution, riders
        names = [hull.name for hull in survey.hulls + survey.riders]
        self._file = BodiesFile(folder.bodies, self.times, names, keep)

    def write(self, state: SurfaceState) -> None:
        """See `Output`."""
        motion, velocity = np.zeros((2, 0, 6))
        loads: dict[str, Array] = {}
        none = np.full((len(self._riders), 6), np.nan)
        if self._solution is not None:
            motion, velocity = self._solution.motions(state.time)
            given = self._solution.loads(state.time)
            loads = {name: np.vstack([load, none]) for name, load in given.items()}
        motion = np.vstack([motion, *(rider.motion(state) for rider in self._riders)])
        velocity = np.vstack([velocity, *(rider.velocity(state) for rider in self._riders)])
        self._file.add(state.time, motion, velocity, loads)


class GaugesOutput(_FileOutput):
    """gauges.nc."""

    _file: GaugesFile

    def __init__(
        self,
        survey: Survey,
        flow: PanelSamplers | GridSamplers | None,
        folder: RunFolder,
        keep: int | None,
    ) -> None:
        gauges = survey.case.gauge
        self.times = fine_times(survey)
        xy = np.array([gauge.position for gauge in gauges], dtype=np.float64)
        self._dry = dry_places(survey, xy)
        self._incident = survey.sea.at(np.column_stack([xy, np.zeros(len(xy))]))
        self._solved = None if flow is None else flow.surface_sampler(xy)
        decks = [math.nan if gauge.deck is None else gauge.deck for gauge in gauges]
        names = [gauge.name for gauge in gauges]
        self._file = GaugesFile(folder.gauges, self.times, names, xy, decks, keep)

    def write(self, state: SurfaceState) -> None:
        """See `Output`."""
        incident = np.where(self._dry, np.nan, self._incident.elevation(state.time))
        solved = 0.0 if self._solved is None else self._solved.elevation(state)
        self._file.add(state.time, incident + solved, incident)


class HandoffOutput:
    """One hand-off, told how the bodies move."""

    def __init__(self, handoff: Handoff, solution: Solution | None) -> None:
        self._handoff, self._solution = handoff, solution
        self.times = handoff.times

    @property
    def count(self) -> int:
        """See `Output`."""
        return self._handoff.count

    def write(self, state: SurfaceState) -> None:
        """See `Output`."""
        bodies = None if self._solution is None else self._solution.motions(state.time)[1]
        self._handoff.write(state, bodies)

    def flush(self) -> None:
        """See `Output`."""
        self._handoff.flush()


def outputs_of(
    survey: Survey, solution: Solution | None, folder: RunFolder, kept: Mapping[str, int] | None
) -> dict[str, Output]:
    """All outputs of a case by name; `kept`: how many instants each has from before."""
    case = survey.case
    flow = None if solution is None else solution.samplers()
    riders = [Rider(hull, survey.sea, flow) for hull in survey.riders]
    outputs: dict[str, Output] = {}

    def keep(name: str) -> int | None:
        return None if kept is None else kept[name]

    if solution is not None:
        outputs["history"] = HistoryOutput(solution, folder, keep("history"))
        outputs["energy"] = EnergyOutput(solution, folder, keep("energy"))
    if case.body:
        outputs["bodies"] = BodiesOutput(survey, solution, riders, folder, keep("bodies"))
    if case.gauge:
        outputs["gauges"] = GaugesOutput(survey, flow, folder, keep("gauges"))
    scene = Scene(
        survey.sea,
        flow,
        survey.surface_in,
        survey.hulls,
        survey.periods.kept,
        survey.periods.peak,
        survey.scattered,
        start_up(survey).share,
    )
    for entry in case.handoff:
        name = f"handoff/{entry.name}"
        handoff = Handoff(entry, case, scene, folder.handoff, keep(name))
        outputs[name] = HandoffOutput(handoff, solution)
    if case.frames is not None:
        done = keep("frames") or 0
        outputs["frames"] = FramesOutput(survey, solution, flow, riders, folder.frames, done)
    return outputs


def recorded(survey: Survey) -> npt.NDArray[np.int64] | None:
    """The nodes that history.nc holds, of a region; None: all."""
    region, sheet = survey.case.run.history_region, survey.sheet
    if region is None or sheet is None:
        return None
    offset = np.abs(sheet.xy - region.centre)
    return np.flatnonzero((offset <= np.array(region.size) / 2 + 1e-9).all(axis=1))


def fine_times(survey: Survey) -> Array:
    """Instants of gauges, loads and energy: every record, and enough between to draw waves."""
    return np.linspace(0.0, survey.case.run.duration, instants_between(survey) + 1)


def dry_places(survey: Survey, xy: Array) -> npt.NDArray[np.bool_]:
    """Which places (n, 2) lie on or inside a waterline."""
    points = np.column_stack([xy, np.zeros(len(xy))])
    dry = np.zeros(len(xy), dtype=bool)
    for hull in survey.hulls:
        dry |= inside(hull.mesh, points)
    return dry
