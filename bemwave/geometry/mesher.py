"""Calls gmsh in a process of its own, under a time limit."""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Any

import numpy as np

from bemwave.errors import InputError, MissingLibraryError

INSTALL_LINE = (
    "apt-get install -y --no-install-recommends libglu1-mesa libgl1 libxrender1 libxcursor1 "
    "libxfixes3 libxft2 libxinerama1 fontconfig libgomp1"
)
_LIBRARY_MISSING = 41


MOST_TRIANGLES = 100_000  # far beyond what can be solved; more is a slip of the pen


def check_count(area: float, size: float, what: str) -> None:
    """Refuse a mesh that would have absurdly many triangles, before it fills the memory.

    Raises
    ------
    InputError
        If triangles of edge `size`, m, would cover `area`, m2, more than MOST_TRIANGLES times.
    """
    count = area / (0.433 * size**2)  # equilateral
    if count > MOST_TRIANGLES:
        raise InputError(
            f"{what} = {size:g} m makes about {count:.1g} triangles, and {MOST_TRIANGLES:g} are "
            "the most that are meshed: give a larger one"
        )


def run_job(
    name: str, values: dict[str, Any], what: str, seconds: float = 120.0
) -> dict[str, np.ndarray[Any, Any]]:
    """Have gmsh do a job of `gmsh_jobs` and return its arrays.

    Parameters
    ----------
    name : str
        "remesh", "water" or "columns".
    values : dict
        Arrays and numbers of the job.
    what : str
        What is being done, for messages: "remeshing hull.stl at 0.5 m".
    seconds : float
        Time limit.

    Raises
    ------
    MissingLibraryError
        If gmsh cannot load its system libraries; the message has the install line.
    InputError
        If gmsh gives up or takes longer than the limit.
    """
    script = Path(__file__).with_name("gmsh_jobs.py")
    with tempfile.TemporaryDirectory() as folder:
        job, result = Path(folder, "job.npz"), Path(folder, "result.npz")
        np.savez(job, **values)
        try:
            # -P: this folder's modules must not stand in for the library's of the same name
            done = subprocess.run(
                [sys.executable, "-P", str(script), name, str(job), str(result)],
                cwd=folder,
                capture_output=True,
                text=True,
                timeout=seconds,
                check=False,
            )
        except subprocess.TimeoutExpired:
            raise InputError(
                f"{what} took longer than {seconds:g} s and was stopped: "
                "try a larger size, or repair and mesh the file in a mesh program first"
            ) from None
        if done.returncode == _LIBRARY_MISSING:
            raise MissingLibraryError(
                f"{what} needs the mesher gmsh, which lacks a system library "
                f"({done.stderr.strip()}): run\n  {INSTALL_LINE}\nor give a ready-made mesh"
            )
        if done.returncode != 0 or not result.exists():
            raise InputError(
                f"{what} failed in the mesher ({_last_line(done.stderr)}): "
                "try another size, or repair and mesh the file in a mesh program first"
            )
        with np.load(result) as arrays:
            return dict(arrays)


def library_missing() -> str:
    """Return the install line if gmsh cannot load its libraries here, else an empty string."""
    check = [sys.executable, "-c", "import gmsh"]
    done = subprocess.run(check, capture_output=True, check=False)
    return f"gmsh cannot be loaded: run {INSTALL_LINE}" if done.returncode else ""


def _last_line(text: str) -> str:
    lines = text.strip().splitlines()
    return lines[-1] if lines else "no message"
