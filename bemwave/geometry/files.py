"""Mesh files in and out: STL, OBJ, PLY, VTU, MSH, VTP.

| ending | library | part names | precision |
|---|---|---|---|
| .stl binary | meshio | no | float32 |
| .stl text | own | solids | all digits |
| .obj | meshio, own | groups, objects | all digits |
| .ply | meshio | no | float64 |
| .vtu | meshio | in the name of the cell array | float64 |
| .msh | meshio | physical groups | float64 |
| .vtp | vtk | field data | float64 |
"""

from __future__ import annotations

import contextlib
import io
import os
import warnings
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import TypeVar

import numpy as np

from bemwave.errors import BemwaveError, InputError
from bemwave.geometry import meshio_files, text_files, vtp_files
from bemwave.geometry.strangers import memory_bounded, refuse_hostile
from bemwave.geometry.surface_mesh import SurfaceMesh

_READERS: dict[str, Callable[[Path], SurfaceMesh]] = {
    ".stl": text_files.read_stl,
    ".obj": text_files.read_obj,
    ".ply": meshio_files.read_ply,
    ".vtu": meshio_files.read_vtu,
    ".msh": meshio_files.read_msh,
    ".vtp": vtp_files.read_vtp,
}
_WRITERS: dict[str, Callable[[SurfaceMesh, Path], None]] = {
    ".stl": meshio_files.write_stl,
    ".obj": text_files.write_obj,
    ".ply": meshio_files.write_ply,
    ".vtu": meshio_files.write_vtu,
    ".msh": meshio_files.write_msh,
    ".vtp": vtp_files.write_vtp,
}
FORMATS = tuple(_READERS)

_T = TypeVar("_T")


def read_mesh(path: str | os.PathLike[str]) -> SurfaceMesh:
    """Read a surface mesh; the file's ending tells the format.

    Quads and polygons are split into triangles. Equal corners of an STL's triangles become one
    point; nothing else is merged, turned or repaired. A file without part names gives one part,
    "unnamed".

    Parameters
    ----------
    path : path
        .stl (text or binary), .obj, .ply, .vtu, .msh or .vtp.

    Raises
    ------
    InputError
        If the file is missing, of another format, cut off, without triangles, or has coordinates
        that are not numbers.

    Examples
    --------
    >>> mesh = read_mesh("meshes/tender.stl")
    """
    path = Path(path)
    reader = _of_ending(_READERS, path)
    if not path.is_file():
        raise InputError(f"{path}: there is no such mesh file; check the name and the folder")
    if path.stat().st_size == 0:
        raise InputError(f"{path} is empty; a mesh was expected")
    refuse_hostile(path)
    advice = "write it out again"
    with (
        memory_bounded(path),
        _contained(f"{path} cannot be read as {path.suffix.lower()}", advice),
    ):
        mesh = reader(path)
    if not len(mesh.triangles):
        raise InputError(f"{path} holds no triangles; a surface mesh was expected")
    bad = int(np.count_nonzero(~np.isfinite(mesh.points).all(axis=1)))
    if bad:
        raise InputError(f"{path}: {bad} points have coordinates that are not finite numbers")
    return mesh


def write_mesh(mesh: SurfaceMesh, path: str | os.PathLike[str], *, text: bool = False) -> None:
    """Write a surface mesh; the file's ending tells the format.

    Parameters
    ----------
    mesh : SurfaceMesh
    path : path
        .stl, .obj, .ply, .vtu, .msh or .vtp; written over if it exists.
    text : bool
        STL only: text with a solid for each part, rather than binary without names.

    Raises
    ------
    InputError
        If the ending is none of these or the file cannot be written.
    """
    path = Path(path)
    writer = _of_ending(_WRITERS, path)
    if text and path.suffix.lower() == ".stl":
        writer = text_files.write_stl
    with _contained(f"{path} cannot be written", "check the folder"):
        writer(mesh, path)


def _of_ending(table: dict[str, _T], path: Path) -> _T:
    if path.suffix.lower() not in table:
        raise InputError(
            f"{path}: meshes ending in {path.suffix or 'nothing'!r} are not known; "
            f"use one of {' '.join(table)}"
        )
    return table[path.suffix.lower()]


@contextlib.contextmanager
def _contained(what: str, advice: str) -> Iterator[None]:
    """Let nothing of the mesh libraries out: exits, exceptions, warnings, printing."""
    noise = io.StringIO()
    try:
        with (
            warnings.catch_warnings(),
            contextlib.redirect_stdout(noise),
            contextlib.redirect_stderr(noise),
        ):
            warnings.simplefilter("ignore")
            yield
    except BemwaveError:
        raise
    except (Exception, SystemExit) as error:
        reason = " ".join(str(error).split()) or type(error).__name__
        raise InputError(f"{what} ({reason[:200]}): {advice}") from None
