"""Displacement maps: where the surface has moved from still water, as an image for each frame."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from bemwave.errors import MissingLibraryError
from bemwave.frames.sheet import Array, Squares


def need_openexr() -> None:
    """Raise MissingLibraryError if OpenEXR images cannot be written."""
    try:
        import OpenEXR  # noqa: F401
    except ImportError as error:
        raise MissingLibraryError(
            "[frames] displacement_maps needs the package OpenEXR; install it with: "
            'pip install "bemwave[pictures]"'
        ) from error


def write_map(path: Path, squares: Squares, moved: Array, note: str) -> None:
    """Write how far vertices have moved, (n, 3) m, as OpenEXR, 32-bit: R, G, B along x, y, z.

    A pixel's middle is a vertex of the sheet; rows run from the greatest y down, as images do.
    Places without water are zero.
    """
    import OpenEXR

    nx, ny = squares.count
    image = np.zeros((ny * nx, 3), dtype=np.float32)
    image[squares.rows] = moved
    image = np.ascontiguousarray(image.reshape(ny, nx, 3)[::-1])
    (x, y), (dx, dy) = squares.corner, squares.step
    header = {
        "compression": OpenEXR.ZIP_COMPRESSION,
        "type": OpenEXR.scanlineimage,
        "comments": (
            f"metres, R G B along x y z; pixel middles from x = {x:.9g}, y = {y:.9g} every "
            f"{dx:.9g}, {dy:.9g} m, last row first; {note}"
        ),
    }
    with OpenEXR.File(header, {"RGB": image}) as file:
        file.write(str(path))
