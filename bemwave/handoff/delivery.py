"""One hand-off of a run, from its entry in the case to its files."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from bemwave.case import Case
from bemwave.case.output import Handoff as Entry
from bemwave.flow.state import SurfaceState
from bemwave.geometry.hull import Hull
from bemwave.geometry.inside import inside
from bemwave.handoff.box import Array, Box, PointSet, box_points, box_volume
from bemwave.handoff.closure import Closure
from bemwave.handoff.divergence import CellDivergence
from bemwave.handoff.fields import Flow
from bemwave.handoff.placing import EARTH, Axes
from bemwave.handoff.plan import Waterplane
from bemwave.handoff.point_list import read_points
from bemwave.handoff.sampler import HandoffSampler
from bemwave.handoff.writer import HandoffFile, Terms
from bemwave.waves import Sea

INSTANTS_PER_PERIOD = 40


@dataclass(frozen=True)
class Scene:
    """What hand-offs are taken from.

    Attributes
    ----------
    sea : the incident waves, mirrored ones included.
    scattered : those of them that hulls scatter; None: all. The others pass through hulls.
    start_up : the share of these that hulls scatter at a time, 1 once the run has started up.
    flow : samplers of the solved part; None where nothing is solved.
    surface : points (n, 2) and weights [m2] that integrate over the water's surface in a box.
    hulls : the bodies, at rest.
    shortest_period, peak_period : s, of what the field holds.
    """

    sea: Sea
    flow: Flow | None
    surface: Callable[[Box], tuple[Array, Array]]
    hulls: Sequence[Hull] = ()
    shortest_period: float = math.inf
    peak_period: float = math.inf
    scattered: Sea | None = None
    start_up: Callable[[float], float] = lambda time: 1.0

    def solid(self, points: Array) -> NDArray[np.bool_]:
        """Which points (n, 3) lie inside hulls, or straight over their waterplanes."""
        within = np.zeros(len(points), dtype=bool)
        for hull in self.hulls:
            within |= inside(hull.mesh, points)
        return within


class Handoff:
    """Samples a scene at the points of one [[handoff]] and writes its files.

    Parameters
    ----------
    entry : case.Handoff
        One of `case.handoff`.
    case : Case
    scene : Scene
    folder : Path
        Where NAME.nc and NAME-start.nc go.
    keep : int, optional
        Instants of an interrupted run to keep; by default the files are made anew.

    Attributes
    ----------
    times : (n,) s, the instants to be written.

    Raises
    ------
    InputError
        If a list of points cannot be read, or leaves the useful water.
    """

    def __init__(
        self,
        entry: Entry,
        case: Case,
        scene: Scene,
        folder: Path,
        keep: int | None = None,
    ) -> None:
        self._entry, self._case, self._scene, self._folder = entry, case, scene, folder
        self.times = instants(entry, scene.shortest_period)
        self._box = box_of(entry)
        points = read_points(entry, case) if self._box is None else box_points(self._box)
        self._sampler = self._sampler_at(points)
        self._balance = None if self._box is None else self._balances(self._box, points)
        self._file = self._open(entry.name, points, self.times, keep)

    @property
    def count(self) -> int:
        """Number of instants written so far."""
        return self._file.count

    def write(self, state: SurfaceState, bodies: Array | None = None) -> None:
        """Write the instant of a solved state.

        `bodies` (hulls, 6): velocity of each hull along and about its own axes, at its centre of
        mass, m/s and rad/s; None where all are at rest.
        """
        if self.count == 0 and self._entry.volume_at_start and self._box is not None:
            self._write_volume(self._box, state)
        instant = self._sampler.at(state)
        if self._balance is None:
            self._file.append(instant)
        else:
            closure, divergence = self._balance
            self._file.append(instant, closure.at(instant, state, bodies), divergence.at(state))

    def flush(self) -> None:
        """Put every instant written so far on the disk."""
        self._file.flush()

    def _sampler_at(self, points: PointSet) -> HandoffSampler:
        scene = self._scene
        return HandoffSampler(
            points,
            scene.sea,
            scene.flow,
            self._entry.crest,
            self._entry.field,
            scene.solid,
        )

    def _balances(self, box: Box, points: PointSet) -> tuple[Closure, CellDivergence]:
        scene = self._scene
        # the incident waves alone know of no bodies and close over their waterplanes too
        alone = self._entry.field == "incident"
        flow = None if alone else scene.flow
        waterplanes = [] if alone else [Waterplane.of(hull) for hull in scene.hulls]
        closure = Closure(
            box,
            points,
            scene.sea,
            flow,
            scene.surface,
            waterplanes,
            scene.scattered,
            scene.start_up,
        )
        return closure, CellDivergence(box, scene.sea, flow, scene.solid)

    def _open(self, name: str, points: PointSet, times: Array, keep: int | None) -> HandoffFile:
        every = self.times[1] - self.times[0] if len(self.times) > 1 else 0.0
        terms = Terms(
            self._case.text,
            self._entry.crest,
            float(every),
            self._scene.shortest_period,
            self._scene.peak_period,
        )
        parts = self._entry.field == "parts"
        path = self._folder / f"{name}.nc"
        balanced = self._balance is not None and times is self.times
        return HandoffFile(path, times, points, axes_of(self._entry), terms, parts, balanced, keep)

    def _write_volume(self, box: Box, state: SurfaceState) -> None:
        """Write the whole box once, to start the near-field solver from."""
        points = box_volume(box)
        file = self._open(f"{self._entry.name}-start", points, self.times[:1], None)
        file.append(self._sampler_at(points).at(state))
        file.flush()


def instants(entry: Entry, shortest_period: float) -> Array:
    """Times of a hand-off, s: `start` to `end`, both included.

    "auto" takes `INSTANTS_PER_PERIOD` in the shortest period, or a little more so that they fit.
    """
    span = entry.end - entry.start
    every = shortest_period / INSTANTS_PER_PERIOD if entry.every == "auto" else entry.every
    steps = max(1, math.ceil(span / every - 1e-6)) if span > 0 else 0
    return np.linspace(entry.start, entry.end, steps + 1)


def box_of(entry: Entry) -> Box | None:
    """The box of an entry on earth, or None where it has a list of points."""
    if entry.box is None:
        return None
    box = entry.box
    angle = math.radians(box.angle)
    return Box(box.centre, box.size, angle, box.bottom, box.top, entry.spacing, entry.zone)


def axes_of(entry: Entry) -> Axes:
    """The axes an entry's file speaks in.

    The box's own, with their origin at its centre; earth's, where the box is not turned and no
    place is given. A place stands in those axes.
    """
    axes = EARTH
    if entry.box is not None and (entry.box.angle != 0.0 or entry.place is not None):
        axes = Axes((*entry.box.centre, 0.0), math.radians(entry.box.angle))
    if entry.place is None:
        return axes
    place = entry.place
    return axes.moved(place.origin, place.heading, place.up, place.time_zero)
