"""OpenUSD: one file with a time sample for each frame, written as a stream.

While a run goes on each frame is a small layer of its own in surface.parts/, and surface.usdc is
a stage that plays those written so far as value clips: it opens whatever happens to the run. With
the last frame their samples are moved into surface.usdc itself, which then needs nothing beside
it. What is held in memory is one frame.
"""

from __future__ import annotations

import os
import shutil
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from bemwave.errors import MissingLibraryError
from bemwave.frames.sheet import Array, Sheet
from bemwave.frames.usd_prims import (
    Guide,
    define_body,
    define_guide,
    primvar,
    scalars,
    set_triangles,
    valid_names,
    value_types,
    vectors,
)
from bemwave.geometry.pose import Pose
from bemwave.geometry.surface_mesh import SurfaceMesh

SAVED_AT_ONCE = 8  # frames moved into the one file between two of its saves


def need_usd() -> None:
    """Raise MissingLibraryError if OpenUSD files cannot be written."""
    try:
        import pxr  # noqa: F401
    except ImportError as error:
        raise MissingLibraryError(
            '[frames] format "usd" needs the package usd-core; install it with: '
            'pip install "bemwave[pictures]"'
        ) from error


class UsdFile:
    """surface.usdc: /sea/water, /sea/bodies/NAME, /sea/guides/NAME; metres, z up.

    Parameters
    ----------
    folder : Path
    sheet : Sheet
    bodies : mapping of names to SurfaceMesh in the axes that their poses move.
    guides : sequence of Guide
    fps : float
    numbers : sequence of int
        Time codes of all the frames, one after the other.
    note : str
    keep : int
        Frames of an interrupted run to keep.
    """

    def __init__(
        self,
        folder: Path,
        sheet: Sheet,
        bodies: Mapping[str, SurfaceMesh],
        guides: Sequence[Guide],
        fps: float,
        numbers: Sequence[int],
        note: str,
        keep: int,
    ) -> None:
        self._path, self._parts = folder / "surface.usdc", folder / "surface.parts"
        self._numbers = numbers
        whole = self._path.exists() and not self._parts.exists()
        self._done = whole and keep > 0
        self._sheet, self._bodies, self._guides = sheet, bodies, guides
        self._fps, self._note = fps, note
        self._names = dict(zip(bodies, valid_names(list(bodies)), strict=True))
        shutil.rmtree(self._parts.with_suffix(".old"), ignore_errors=True)
        if not self._done:
            self._parts.mkdir(exist_ok=True)

    def write(
        self,
        frame: int,
        points: Array,
        normals: Array,
        velocity: Array,
        primvars: Mapping[str, Array],
        places: Mapping[str, Pose],
    ) -> None:
        """Write the frame of this number, 0 the first; those before it stand.

        Parameters
        ----------
        points, normals, velocity : (n, 3) m, unit, m/s.
        primvars : (n,) by name.
        places : of every body.
        """
        if self._done:  # all of it stands from before an interruption
            return
        from pxr import Gf, Sdf, UsdGeom

        code = float(self._numbers[frame])
        beside = self._parts / f"part.{self._numbers[frame]}.usdc"
        stage = _new_stage(beside)
        water = UsdGeom.Mesh(stage.OverridePrim("/sea/water"))
        water.CreatePointsAttr().Set(vectors(points), code)
        water.CreateNormalsAttr().Set(vectors(normals), code)
        water.CreateVelocitiesAttr().Set(vectors(velocity), code)
        corners = np.array([points.min(axis=0), points.max(axis=0)])
        water.CreateExtentAttr().Set(vectors(corners), code)
        for name, values in primvars.items():
            kind = value_types().FloatArray
            water.GetPrim().CreateAttribute(f"primvars:{name}", kind).Set(scalars(values), code)
        for name, place in places.items():
            prim = stage.OverridePrim(f"/sea/bodies/{self._names[name]}")
            matrix = np.eye(4)
            matrix[:3, :3], matrix[3, :3] = place.rotation.T, place.shift
            attribute = prim.CreateAttribute("xformOp:transform", Sdf.ValueTypeNames.Matrix4d)
            attribute.Set(Gf.Matrix4d(matrix.tolist()), code)
        stage.GetRootLayer().Save()
        os.replace(beside, self._part(frame))
        last = frame == len(self._numbers) - 1
        if last:
            self._join(list(primvars))
        else:
            self._play(frame + 1, list(primvars))

    def _part(self, frame: int) -> Path:
        return self._parts / f"frame.{self._numbers[frame]}.usdc"

    def _play(self, count: int, primvars: list[str]) -> None:
        """Make surface.usdc play the first `count` parts."""
        from pxr import Usd

        still, beside = self._parts / "still.usdc", self._path.with_stem("surface.part")
        if not still.exists():
            self._define(new := _new_stage(still.with_stem("still.part")), primvars)
            new.GetRootLayer().Save()
            os.replace(still.with_stem("still.part"), still)
        stage = _new_stage(beside)
        stage.GetRootLayer().subLayerPaths.append(f"./{self._parts.name}/{still.name}")
        self._describe(stage, self._numbers[count - 1])
        clips = Usd.ClipsAPI(stage.OverridePrim("/sea"))
        names = [f"./{self._parts.name}/{self._part(k).name}" for k in range(count)]
        codes = [float(number) for number in self._numbers[:count]]
        clips.SetClipPrimPath("/sea")
        clips.SetClipAssetPaths(_assets(names))
        clips.SetClipActive([(code, k) for k, code in enumerate(codes)])
        clips.SetClipTimes([(code, code) for code in codes])
        clips.SetClipManifestAssetPath(_assets(names)[0])
        stage.GetRootLayer().Save()
        os.replace(beside, self._path)

    def _join(self, primvars: list[str]) -> None:
        """Move the samples of all parts into surface.usdc and take the parts away."""
        from pxr import Sdf

        beside = self._path.with_stem("surface.part")
        stage = _new_stage(beside)
        self._define(stage, primvars)
        self._describe(stage, self._numbers[-1])
        whole = stage.GetRootLayer()
        whole.Save()
        for frame in range(len(self._numbers)):
            part = Sdf.Layer.OpenAsAnonymous(str(self._part(frame)))
            _copy_samples(part, whole)
            if frame % SAVED_AT_ONCE == SAVED_AT_ONCE - 1:
                whole.Save()
        whole.Save()
        del whole, stage
        os.replace(beside, self._path)
        old = self._parts.with_suffix(".old")  # so that a kill leaves all of the parts or none
        os.replace(self._parts, old)
        shutil.rmtree(old)
        self._done = True

    def _describe(self, stage: Any, last: int) -> None:
        """Axes, units and times, which belong in the file that is opened."""
        from pxr import UsdGeom

        UsdGeom.SetStageUpAxis(stage, UsdGeom.Tokens.z)
        UsdGeom.SetStageMetersPerUnit(stage, UsdGeom.LinearUnits.meters)
        stage.SetTimeCodesPerSecond(self._fps)
        stage.SetFramesPerSecond(self._fps)
        stage.SetStartTimeCode(self._numbers[0])
        stage.SetEndTimeCode(last)
        stage.GetRootLayer().documentation = self._note
        stage.SetDefaultPrim(stage.GetPrimAtPath("/sea"))

    def _define(self, stage: Any, primvars: list[str]) -> None:
        """All that does not change from frame to frame."""
        from pxr import Usd, UsdGeom

        sea = UsdGeom.Xform.Define(stage, "/sea")
        Usd.ModelAPI(sea).SetKind("component")
        self._define_water(stage, primvars)
        UsdGeom.Scope.Define(stage, "/sea/bodies")
        for name, mesh in self._bodies.items():
            define_body(stage, f"/sea/bodies/{self._names[name]}", mesh, name)
        UsdGeom.Scope.Define(stage, "/sea/guides")
        words = valid_names([guide.name for guide in self._guides])
        for word, guide in zip(words, self._guides, strict=True):
            define_guide(stage, f"/sea/guides/{word}", guide)

    def _define_water(self, stage: Any, primvars: list[str]) -> None:
        from pxr import UsdGeom

        water = UsdGeom.Mesh.Define(stage, "/sea/water")
        set_triangles(water, self._sheet.mesh)
        water.CreatePointsAttr()
        water.CreateNormalsAttr()
        water.SetNormalsInterpolation(UsdGeom.Tokens.vertex)
        water.CreateVelocitiesAttr()
        water.CreateExtentAttr()
        plan = self._sheet.mesh.points[:, :2]
        low, size = plan.min(axis=0), np.ptp(plan, axis=0)
        primvar(water, "st", value_types().TexCoord2fArray).Set(vectors((plan - low) / size))
        primvar(water, "inside", value_types().FloatArray).Set(scalars(self._sheet.under_hull))
        for name in primvars:
            primvar(water, name, value_types().FloatArray)


def _new_stage(path: Path) -> Any:
    from pxr import Usd

    path.unlink(missing_ok=True)
    return Usd.Stage.CreateNew(str(path))


def _copy_samples(part: Any, whole: Any) -> None:
    """Copy every time sample of a layer into another that has the same attributes."""

    def visit(path: Any) -> None:
        if path.IsPropertyPath():
            for code in part.ListTimeSamplesForPath(path):
                whole.SetTimeSample(path, code, part.QueryTimeSample(path, code))

    part.Traverse(part.pseudoRoot.path, visit)


def _assets(names: Sequence[str]) -> Any:
    from pxr import Sdf

    return Sdf.AssetPathArray([Sdf.AssetPath(name) for name in names])
