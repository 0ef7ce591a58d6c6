"""frames/: the water surface and the bodies as numbered files for a renderer."""

from __future__ import annotations

import math
import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path

import numpy as np

from bemwave.case.output import Frames as Entry
from bemwave.flow.state import SurfaceState
from bemwave.frames.glb import write_glb
from bemwave.frames.maps import need_openexr, write_map
from bemwave.frames.obj import write_obj
from bemwave.frames.ply import write_ply
from bemwave.frames.sheet import Array, Bools, Sheet, cut_sheet, grid_sheet, solver_sheet
from bemwave.frames.surface import MovingSurface, WaterFrame, vertex_normals
from bemwave.frames.usd import UsdFile, need_usd
from bemwave.frames.usd_prims import Guide
from bemwave.frames.vtk import pvd_text, write_vtp
from bemwave.geometry.hull import Hull
from bemwave.geometry.pose import Pose
from bemwave.geometry.surface_mesh import SurfaceMesh

_ENDINGS = {"ply": ".ply", "vtk": ".vtp", "obj": ".obj"}
_WRITERS = {"ply": write_ply, "vtk": write_vtp, "obj": write_obj}
_STAY = Pose(np.eye(3), np.zeros(3))


@dataclass(frozen=True)
class DrawnBody:
    """A body as it is drawn.

    name : as in the case.
    mesh : in its own axes, normals out of the body; topsides too, if they are to be seen.
    place : from these axes to earth, at rest.
    moves : whether it is written anew for every frame.
    """

    name: str
    mesh: SurfaceMesh
    place: Pose = _STAY
    moves: bool = False

    def placed(self, moved: Pose) -> Pose:
        """From its own axes to earth when it has moved from its place at rest."""
        return Pose(moved.rotation @ self.place.rotation, moved(self.place.shift))


class FrameWriter:
    """Writes the frames of a run, one at a time; nothing is kept from frame to frame.

    surface_NUMBER.EXT holds the water; body_NAME.EXT a body at rest, body_NAME_NUMBER.EXT one that
    moves; NAME.pvd, for vtk, the times of the files. surface.usdc holds all frames, preview.glb the
    latest, displacement_NUMBER.exr where the surface has moved. Each file appears under its name
    when it is whole.

    Parameters
    ----------
    entry : case.Frames
    surface : MovingSurface
    bodies : sequence of DrawnBody
    folder : Path
    keep : int
        Frames of an interrupted run to keep.
    guides : sequence of Guide
    note : str
        What whoever opens a file must know.

    Attributes
    ----------
    times : (n,) s, of the frames to be written.
    """

    def __init__(
        self,
        entry: Entry,
        surface: MovingSurface,
        bodies: Sequence[DrawnBody],
        folder: Path,
        keep: int = 0,
        guides: Sequence[Guide] = (),
        note: str = "",
    ) -> None:
        need_libraries(entry)
        self.times = frame_times(entry)
        self.count = keep
        self._entry, self._folder, self._bodies, self._note = entry, folder, bodies, note
        self._surface = surface
        folder.mkdir(parents=True, exist_ok=True)
        for body in bodies:
            if not body.moves:
                self._put(f"body_{body.name}", *_moved(body, _STAY), {})
        numbers = range(entry.first_number, entry.first_number + len(self.times))
        meshes = {body.name: body.mesh for body in bodies}
        self._usd = (
            UsdFile(folder, surface.sheet, meshes, guides, entry.fps, numbers, note, keep)
            if "usd" in entry.formats
            else None
        )

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
        shading: dict[str, Array] = {}
        if self._entry.shading:
            shading["steepness"] = frame.steepness
            shading["downward_acceleration"] = frame.downward_acceleration
        gone = {b.name: (places or {})[b.name] if b.moves else _STAY for b in self._bodies}
        self._put_each(frame, shading, gone)
        if self._usd is not None:
            at = {body.name: body.placed(gone[body.name]) for body in self._bodies}
            points = frame.mesh.points
            self._usd.write(self.count, points, frame.normals, frame.velocity, shading, at)
        if "glb" in self._entry.formats:
            meshes = {"water": (frame.mesh, frame.normals)}
            meshes |= {body.name: _moved(body, gone[body.name]) for body in self._bodies}
            self._replace("preview.glb", lambda path: write_glb(path, meshes, self._note))
        if self._entry.displacement_maps:
            self._put_map(frame)
        self.count += 1
        if "vtk" in self._entry.formats:
            self._list_times("surface")
            for body in self._bodies:
                if body.moves:
                    self._list_times(f"body_{body.name}")

    def _put_each(
        self, frame: WaterFrame, shading: Mapping[str, Array], gone: Mapping[str, Pose]
    ) -> None:
        """The formats of one file for each mesh and frame."""
        number = self._number(self.count)
        data: dict[str, Array | Bools] = {
            "velocity": frame.velocity,
            "water_velocity": frame.water_velocity,
            "elevation": frame.elevation,
            "inside": frame.under_hull,
            **shading,
        }
        self._put(f"surface_{number}", frame.mesh, frame.normals, data)
        for body in self._bodies:
            if body.moves:
                self._put(f"body_{body.name}_{number}", *_moved(body, gone[body.name]), {})

    def _put_map(self, frame: WaterFrame) -> None:
        squares = self._surface.sheet.squares
        assert squares is not None, "the case has been refused otherwise"
        moved = frame.mesh.points - self._surface.sheet.mesh.points
        name = f"displacement_{self._number(self.count)}.exr"
        self._replace(name, lambda path: write_map(path, squares, moved, self._note))

    def _number(self, frame: int) -> str:
        return f"{self._entry.first_number + frame:05d}"

    def _put(
        self, name: str, mesh: SurfaceMesh, normals: Array, data: Mapping[str, Array | Bools]
    ) -> None:
        for kind in self._entry.formats:
            if kind in _WRITERS:
                write = partial(
                    _WRITERS[kind], mesh=mesh, normals=normals, data=data, note=self._note
                )
                self._replace(name + _ENDINGS[kind], write)

    def _replace(self, name: str, write: Callable[[Path], None]) -> None:
        path = self._folder / name
        beside = path.with_stem(path.stem + ".part")
        write(beside)
        os.replace(beside, path)

    def _list_times(self, name: str) -> None:
        files = [
            (float(time), f"{name}_{self._number(k)}.vtp")
            for k, time in enumerate(self.times[: self.count])
        ]
        text = pvd_text(files)
        self._replace(f"{name}.pvd", lambda path: _write_text(path, text))


def _moved(body: DrawnBody, gone: Pose) -> tuple[SurfaceMesh, Array]:
    """A body's mesh on earth and its normals."""
    mesh = body.mesh.with_points(body.placed(gone)(body.mesh.points))
    return mesh, vertex_normals(mesh)


def _write_text(path: Path, text: str) -> None:
    path.write_text(text, encoding="utf-8")


def need_libraries(entry: Entry) -> None:
    """Raise MissingLibraryError if a package that the formats need is not installed."""
    if "usd" in entry.formats:
        need_usd()
    if entry.displacement_maps:
        need_openexr()


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
        return solver_sheet(water, entry.waterline, hulls)
    make = cut_sheet if entry.waterline == "cut" else grid_sheet
    return make(entry.region.centre, entry.region.size, entry.spacing, hulls, solved_in)
