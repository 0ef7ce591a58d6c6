"""frames/: the water surface and the bodies as numbered mesh files for a renderer."""

from __future__ import annotations

import math
import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from bemwave.case.output import Frames as Entry
from bemwave.errors import NotYetError
from bemwave.flow.state import SurfaceState
from bemwave.frames.ply import write_ply
from bemwave.frames.surface import (
    Array,
    Bools,
    Flow,
    MovingSurface,
    Sheet,
    grid_sheet,
    solver_sheet,
    vertex_normals,
)
from bemwave.frames.vtk import pvd_text, write_vtp
from bemwave.geometry.hull import Hull
from bemwave.geometry.pose import Pose
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.waves import Sea

_ENDINGS = {"ply": ".ply", "vtk": ".vtp"}
_WRITERS = {"ply": write_ply, "vtk": write_vtp}


@dataclass(frozen=True)
class DrawnBody:
    """A body as it is drawn.

    name : as in the case.
    mesh : on earth, at rest, normals out of the body; topsides too, if they are to be seen.
    moves : whether it is written anew for every frame.
    """

    name: str
    mesh: SurfaceMesh
    moves: bool = False


class FrameWriter:
    """Writes the frames of a run, one at a time; nothing is kept from frame to frame.

    surface_NUMBER.EXT holds the water; body_NAME.EXT a body at rest, body_NAME_NUMBER.EXT one that
    moves; NAME.pvd, for vtk, the times of the files. Each file appears under its name when it is
    whole.

    Parameters
    ----------
    entry : case.Frames
    sheet : Sheet
        From `sheet_of`.
    sea : Sea
    flow : Flow or None
    bodies : sequence of DrawnBody
    folder : Path
    keep : int
        Frames of an interrupted run to keep.

    Attributes
    ----------
    times : (n,) s, of the frames to be written.
    """

    def __init__(
        self,
        entry: Entry,
        sheet: Sheet,
        sea: Sea,
        flow: Flow | None,
        bodies: Sequence[DrawnBody],
        folder: Path,
        keep: int = 0,
    ) -> None:
        refuse_formats(entry.formats)
        self.times = frame_times(entry)
        self.count = keep
        self._entry, self._folder, self._bodies = entry, folder, bodies
        self._surface = MovingSurface(sheet, sea, flow)
        folder.mkdir(parents=True, exist_ok=True)
        for body in bodies:
            if not body.moves:
                self._put(f"body_{body.name}", body.mesh, vertex_normals(body.mesh), {})

    def write(self, state: SurfaceState, places: Mapping[str, Pose] | None = None) -> None:
        """Write the frame of a solved state.

        Parameters
        ----------
        state : SurfaceState
            At the time of the next frame.
        places : mapping of body names to Pose
            Where each body that moves has gone from its place at rest.
        """
        frame = self._surface.at(state)
        data: dict[str, Array | Bools] = {
            "velocity": frame.velocity,
            "elevation": frame.elevation,
            "inside": frame.under_hull,
        }
        number = self._number(self.count)
        self._put(f"surface_{number}", frame.mesh, frame.normals, data)
        for body in self._bodies:
            if body.moves:
                place = (places or {})[body.name]
                mesh = body.mesh.with_points(place(body.mesh.points))
                self._put(f"body_{body.name}_{number}", mesh, vertex_normals(mesh), {})
        self.count += 1
        if "vtk" in self._entry.formats:
            self._list_times("surface")
            for body in self._bodies:
                if body.moves:
                    self._list_times(f"body_{body.name}")

    def _number(self, frame: int) -> str:
        return f"{self._entry.first_number + frame:05d}"

    def _put(
        self, name: str, mesh: SurfaceMesh, normals: Array, data: Mapping[str, Array | Bools]
    ) -> None:
        for kind in self._entry.formats:
            path = self._folder / (name + _ENDINGS[kind])
            beside = path.with_stem(path.stem + ".part")
            _WRITERS[kind](beside, mesh, normals, data)
            os.replace(beside, path)

    def _list_times(self, name: str) -> None:
        files = [
            (float(time), f"{name}_{self._number(k)}.vtp")
            for k, time in enumerate(self.times[: self.count])
        ]
        beside = self._folder / f"{name}.pvd.part"
        beside.write_text(pvd_text(files), encoding="utf-8")
        os.replace(beside, self._folder / f"{name}.pvd")


def refuse_formats(formats: Sequence[str]) -> None:
    """Raise NotYetError for the first format that this version does not write."""
    for kind in formats:
        if kind not in _WRITERS:
            raise NotYetError(
                f'not yet: [frames] format "{kind}" comes with a later version; write '
                + " or ".join(f'"{known}"' for known in _WRITERS)
            )


def frame_times(entry: Entry) -> Array:
    """Times of the frames, s: from `start` on, `fps` in a second, up to `end`."""
    last = math.floor((entry.end - entry.start) * entry.fps + 1e-6)
    return entry.start + np.arange(last + 1) / entry.fps


def sheet_of(
    entry: Entry,
    water: SurfaceMesh,
    hulls: Sequence[Hull],
    solved_in: Callable[[Array], Bools] | None,
) -> Sheet:
    """Make the surface that an entry asks for: its region in squares, or the solver's panels.

    See `grid_sheet` for `solved_in`.
    """
    if entry.region is None:
        return solver_sheet(water, entry.waterline)
    region = entry.region
    return grid_sheet(region.centre, region.size, entry.spacing, entry.waterline, hulls, solved_in)
