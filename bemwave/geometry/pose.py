"""How a file's axes come to stand in the water: up axis, trim and heel, heading."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.surface_mesh import FloatArray

_UP = {
    # rows: where the new x, y and z come from; all are turns, none mirrors
    "z": [[1, 0, 0], [0, 1, 0], [0, 0, 1]],
    "-z": [[1, 0, 0], [0, -1, 0], [0, 0, -1]],
    "y": [[1, 0, 0], [0, 0, -1], [0, 1, 0]],
    "-y": [[1, 0, 0], [0, 0, 1], [0, -1, 0]],
    "x": [[0, 0, -1], [0, 1, 0], [1, 0, 0]],
    "-x": [[0, 0, 1], [0, 1, 0], [-1, 0, 0]],
}


@dataclass(frozen=True)
class Pose:
    """A turn followed by a shift: x' = rotation x + shift."""

    rotation: FloatArray
    shift: FloatArray

    def __call__(self, points: FloatArray) -> FloatArray:
        """Move points, (..., 3)."""
        return np.asarray(points @ self.rotation.T + self.shift)

    def back(self, points: FloatArray) -> FloatArray:
        """Undo the move."""
        return np.asarray((points - self.shift) @ self.rotation)


def up_rotation(up: str) -> FloatArray:
    """Turn the file's up axis ("z", "y", "x", with a minus sign if it points down) to +z.

    The file's x axis stays where it is unless it is the up axis itself.

    Raises
    ------
    InputError
        If `up` is no axis.
    """
    if up not in _UP:
        raise InputError(f"up = {up!r} given; expected one of {', '.join(_UP)}")
    return np.array(_UP[up], dtype=np.float64)


def trim_and_heel(trim: float, heel: float) -> FloatArray:
    """Rotation by `heel` about x (port up positive), then `trim` about y (bow down), rad."""
    c, s = np.cos(heel), np.sin(heel)
    about_x = np.array([[1.0, 0.0, 0.0], [0.0, c, -s], [0.0, s, c]])
    c, s = np.cos(trim), np.sin(trim)
    about_y = np.array([[c, 0.0, s], [0.0, 1.0, 0.0], [-s, 0.0, c]])
    return np.asarray(about_y @ about_x)


def on_earth(position: tuple[float, float], heading: float) -> Pose:
    """Pose of axes with their origin at `position`, m, turned by `heading`, rad, from +x."""
    c, s = np.cos(heading), np.sin(heading)
    rotation = np.array([[c, -s, 0.0], [s, c, 0.0], [0.0, 0.0, 1.0]])
    return Pose(rotation, np.array([position[0], position[1], 0.0]))
