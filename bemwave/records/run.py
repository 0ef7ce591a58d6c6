"""A run folder, opened: its case, mesh, sea and solved field, sampled anywhere again."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave.case import Case, read_case
from bemwave.errors import InputError
from bemwave.flow.grid import body_elements
from bemwave.flow.grid_samplers import GridSamplers
from bemwave.flow.images import Mirror
from bemwave.flow.region import RegionSamplers
from bemwave.flow.samplers import PanelSamplers
from bemwave.flow.sheet import Sheet
from bemwave.flow.state import ARRAYS, SurfaceState
from bemwave.geometry.files import read_mesh
from bemwave.geometry.hull import Hull
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.waterplane import closed_bodies
from bemwave.handoff import Flow, HandoffSampler, Scene, free_points
from bemwave.handoff.box import Box
from bemwave.handoff.fields import SurfaceMaps, on_surface
from bemwave.handoff.netcdf import read_times, reading
from bemwave.handoff.plan import grid_quadrature, water_quadrature
from bemwave.records.folder import RunFolder, checksums
from bemwave.records.history import History, cubic_in_time
from bemwave.records.manifest import Manifest, Rest, read_manifest
from bemwave.records.series import in_radians
from bemwave.waves import Sea
from bemwave.waves.at_points import SeaAtPoints
from bemwave.waves.sea_file import read_sea

Array = NDArray[np.float64]


@dataclass(frozen=True)
class _Surface:
    """The surface at fixed places: which lie inside waterlines, and the two parts of the others."""

    dry: NDArray[np.bool_]
    incident: SeaAtPoints
    solved: SurfaceMaps | None


class Run:
    """A run that was made, or is being made.

    Parameters
    ----------
    path : path of a run folder

    Raises
    ------
    InputError
        If it holds no run.

    Examples
    --------
    >>> run = open_run("out")                         # doctest: +SKIP
    >>> run.elevation(0.0, 0.0, run.times).max()      # doctest: +SKIP
    1.83
    """

    def __init__(self, path: str | Path) -> None:
        self.folder = RunFolder(Path(path))
        self.manifest: Manifest = read_manifest(self.folder.manifest)
        self._samplers: dict[bytes, HandoffSampler] = {}
        self._surfaces: dict[bytes, _Surface] = {}

    def refuse_changed_files(self) -> None:
        """Raise InputError if any file of a finished run is not as the run left it."""
        for name in self.manifest.files:
            self._whole(self.folder.path / name)

    def _whole(self, path: Path) -> Path:
        """The path itself, if a finished run left that file as it is now."""
        name = str(path.relative_to(self.folder.path))
        expected = self.manifest.files.get(name)
        if expected is None:
            return path
        if not path.is_file():
            raise InputError(
                f"{path} is missing; expected all that the run wrote: copy the whole folder again, "
                "or run the case again"
            )
        if checksums(self.folder.path, [name])[name] != expected:
            raise InputError(
                f"{path} is damaged or was changed after the run; expected it as the run left it "
                f"(SHA-256 {expected[:12]}...): copy it again, or run the case again"
            )
        return path

    @cached_property
    def case(self) -> Case:
        """The case as it was run."""
        return read_case(self._whole(self.folder.case))

    @cached_property
    def mesh(self) -> SurfaceMesh:
        """The panels; the water's part is called "water", a hull's as its body."""
        if self.sheet is not None and not self.manifest.bodies:
            return closed_bodies([])  # a file without triangles is no mesh
        mesh = read_mesh(self._whole(self.folder.mesh))
        return SurfaceMesh(mesh.points, mesh.triangles, mesh.part, self.manifest.part_names)

    @cached_property
    def sea(self) -> Sea:
        """The incident waves."""
        return read_sea(self._whole(self.folder.sea))

    @cached_property
    def history(self) -> History | None:
        """The solved field; None where nothing had to be solved."""
        return History(self.folder.history) if self.folder.history.exists() else None

    @cached_property
    def sheet(self) -> Sheet | None:
        """The grid, on that route."""
        corner = self.manifest.sheet
        if corner is None:
            return None
        shape = (int(corner["shape"][0]), int(corner["shape"][1]))
        return Sheet(corner["west"], corner["south"], corner["spacing"], shape, self.sea.depth)

    @cached_property
    def flow(self) -> Flow | None:
        """Samplers of the solved field; None where nothing had to be solved."""
        if self.history is None:
            return None
        if self.sheet is not None:
            if self.case.run.history_region is not None:
                return cast(Flow, RegionSamplers(self.history.places))  # refuses what it has not
            return GridSamplers(self.sheet, body_elements(self.mesh), density=self.sea.density)
        return PanelSamplers(
            self.mesh,
            self.sea.depth,
            closed=self.manifest.closed,
            mirrors=tuple(Mirror(axis, position) for axis, position in self.manifest.mirrors),
            density=self.sea.density,
        )

    @cached_property
    def hulls(self) -> tuple[Hull, ...]:
        """The bodies that the water flows round, at rest, in the order of the case."""
        return _at_rest(self.manifest.bodies, self.mesh)

    @cached_property
    def riders(self) -> tuple[Hull, ...]:
        """The bodies that ride the surface and make no waves, at rest, in the order of the case."""
        riders = self.manifest.riders
        if not riders:
            return ()
        mesh = read_mesh(self._whole(self.folder.riders))
        return _at_rest(riders, SurfaceMesh(mesh.points, mesh.triangles, mesh.part, tuple(riders)))

    @cached_property
    def scene(self) -> Scene:
        """What a new hand-off is taken from."""
        return Scene(
            sea=self.sea,
            flow=self.flow,
            surface=self._surface_in,
            hulls=self.hulls,
            shortest_period=self.manifest.shortest_period,
            peak_period=self.manifest.peak_period,
        )

    def _surface_in(self, box: Box) -> tuple[Array, Array]:
        if self.sheet is not None:
            return grid_quadrature(box, self.sheet.spacing, self.hulls)
        return water_quadrature(box, self.mesh.keep(self.mesh.in_part("water")))

    @cached_property
    def times(self) -> Array:
        """Times of the records, s."""
        if self.history is not None:
            return self.history.times
        run = self.case.run
        return np.linspace(0.0, run.duration, round(run.duration / run.record_every) + 1)

    def state(self, time: float) -> SurfaceState:
        """The solved field at a time inside the record, s.

        Raises
        ------
        InputError
            If the time is outside the record.
        """
        if not self.times[0] <= time <= self.times[-1]:
            raise InputError(
                f"time {time:g} s was asked for; {self.folder.path} has records from "
                f"{self.times[0]:g} to {self.times[-1]:g} s: ask for one between"
            )
        if self.history is None:
            return SurfaceState(time, **{name: np.zeros(0) for name in ARRAYS})
        return self.history.at(time)

    def body_velocities(self, time: float) -> Array:
        """Velocity of each body along and about its own axes, (hulls, 6), m/s and rad/s.

        Between records it is the cubic through four of them.
        """
        if not self.hulls:
            return np.zeros((0, 6))
        with reading(self.folder.bodies) as file:
            times = read_times(file)
            first, weights = cubic_in_time(times, time)
            rows = slice(first, first + len(weights))
            # after these bodies come those that ride the surface
            near = np.asarray(file["velocity"][rows, : len(self.hulls)], dtype=np.float64)
        return in_radians(np.tensordot(weights, near, axes=1))

    def elevation(self, x: ArrayLike, y: ArrayLike, t: ArrayLike) -> Array:
        """Elevation of the water, m; NaN inside waterlines.

        Parameters
        ----------
        x, y : array_like
            On earth, m; they broadcast.
        t : float or (nt,) array_like
            s.

        Returns
        -------
        ndarray
            The shape of `t`, then that of `x` and `y`.

        Raises
        ------
        InputError
            If a time is outside the record, or a place outside the useful water.
        """
        at_x, at_y = np.broadcast_arrays(
            np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64)
        )
        plan = np.column_stack([at_x.ravel(), at_y.ravel()])
        times = np.asarray(t, dtype=np.float64)
        surface = self._surface(plan)
        elevation = surface.incident.elevation(times.ravel())
        for row, time in zip(elevation, times.ravel(), strict=True):
            state = self.state(float(time))
            row += 0.0 if surface.solved is None else surface.solved.elevation(state)
        elevation[:, surface.dry] = np.nan
        return np.reshape(elevation, (*times.shape, *at_x.shape))

    def velocity(self, points: ArrayLike, t: ArrayLike) -> Array:
        """Velocity of the water on earth, m/s: NaN above the surface and inside hulls.

        Between still water and a crest it is extrapolated, f(0) + z df/dz(0).

        Parameters
        ----------
        points : (..., 3) array_like
            On earth, m.
        t : float or (nt,) array_like
            s.

        Returns
        -------
        ndarray
            The shape of `t`, then that of `points`.

        Raises
        ------
        InputError
            If a time is outside the record, or a place outside the useful water.
        """
        places = np.asarray(points, dtype=np.float64)
        sampler, _ = self._sampler(places.reshape(-1, 3))
        times = np.asarray(t, dtype=np.float64)
        rows = [sampler.at(self.state(float(time))).total.velocity for time in times.ravel()]
        return np.reshape(rows, (*times.shape, *places.shape))

    def _surface(self, plan: Array) -> _Surface:
        """The surface at places (n, 2); the latest is kept for the next call."""
        self._refuse_outside(on_surface(plan))
        key = plan.tobytes()
        if key not in self._surfaces:
            points = on_surface(plan)
            solved = None if self.flow is None else self.flow.surface_sampler(plan)
            self._surfaces = {key: _Surface(self.scene.solid(points), self.sea.at(points), solved)}
        return self._surfaces[key]

    def _sampler(self, points: Array) -> tuple[HandoffSampler, NDArray[np.int64]]:
        """A sampler at points and each point's column; the latest is kept for the next call."""
        self._refuse_outside(points)
        places = free_points(points)
        key = points.tobytes()
        if key not in self._samplers:
            sampler = HandoffSampler(places, self.sea, self.flow, solid=self.scene.solid)
            self._samplers = {key: sampler}
        return self._samplers[key], places.column

    def _refuse_outside(self, points: Iterable[Array]) -> None:
        for x, y, _ in points:
            if not self.case.surface.contains(float(x), float(y)):
                raise InputError(
                    f"the field was asked for at ({x:g}, {y:g}), outside the useful water of "
                    f"{self.folder.path}; expected a place inside [surface] size"
                )


def _at_rest(bodies: Mapping[str, Rest], mesh: SurfaceMesh) -> tuple[Hull, ...]:
    """Hulls of a mesh that has a part for each of them."""
    return tuple(rest.hull(name, mesh.keep(mesh.in_part(name))) for name, rest in bodies.items())


def open_run(path: str | Path) -> Run:
    """Open a run folder.

    Parameters
    ----------
    path : path

    Raises
    ------
    InputError
        If it holds no run.

    Examples
    --------
    >>> run = bemwave.open_run("out")                       # doctest: +SKIP
    >>> run.velocity([[0.0, 0.0, -1.0]], t=20.0)            # doctest: +SKIP
    array([[0.412, 0.003, 0.121]])
    """
    return Run(path)
