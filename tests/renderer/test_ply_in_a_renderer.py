"""PLY frames in another real renderer: scale, up axis, moving points, a picture with water in it.

    python3 -m venv VENV && VENV/bin/pip install mitsuba
    MITSUBA_PYTHON=VENV/bin/python .venv/bin/python -m pytest -m renderer tests/renderer
"""

import os
import subprocess
from pathlib import Path

import numpy as np
import pytest

from bemwave.case.output import Frames as Entry
from bemwave.frames import Crests, DrawnBody, FrameWriter, MovingSurface, grid_sheet
from bemwave.geometry import forms
from bemwave.running.solution import nothing_solved
from bemwave.waves import make_sea

pytestmark = pytest.mark.renderer
PYTHON = os.environ.get("MITSUBA_PYTHON")
SCRIPT = Path(__file__).with_name("render_ply.py")


def test_the_renderer_has_the_file_s_points_and_draws_water(tmp_path):
    if not PYTHON:
        pytest.skip("MITSUBA_PYTHON is not set; see the head of this file")
    sea = make_sea("jonswap", depth=20.0, height=0.8, period=3.5, spreading=10.0)
    sheet = grid_sheet((0.0, 0.0), (80.0, 60.0), 0.4)
    surface = MovingSurface(sheet, sea, None, crests=Crests(sheet, (), 1.0))
    entry = Entry(end=0.5, fps=4.0, formats=("ply",), region={"size": [80.0, 60.0]})
    block = DrawnBody("block", forms.box(5.0, 3.0, 2.0, 0.8).flipped())
    frames = FrameWriter(entry, surface, [block], tmp_path)
    for time in frames.times:
        frames.write(nothing_solved(time))
    water = [str(tmp_path / f"surface_{k:05d}.ply") for k in (1, 2, 3)]
    seen, picture = tmp_path / "seen.npz", tmp_path / "picture.npy"
    files = [*water, str(tmp_path / "body_block.ply")]
    command = [PYTHON, str(SCRIPT), str(seen), str(picture), *files]
    subprocess.run(command, check=True, timeout=900, capture_output=True)
    measured = np.load(seen)
    for number, time in enumerate(frames.times):
        frame = surface.at(nothing_solved(time))
        points = measured[f"vertex_positions_{number}"].reshape(-1, 3)
        np.testing.assert_array_equal(points, frame.mesh.points.astype(np.float32))
        faces = measured[f"faces_{number}"].reshape(-1, 3)
        np.testing.assert_array_equal(faces, frame.mesh.triangles)
        normals = measured[f"vertex_normals_{number}"].reshape(-1, 3)
        np.testing.assert_allclose(normals, frame.normals, atol=1e-6)
    image = np.load(picture)
    sky, sea_part = image[:12], image[70:]
    np.testing.assert_allclose(sky, np.broadcast_to([0.5, 0.6, 0.8], sky.shape), atol=0.02)
    assert sea_part.mean() < 0.8 * sky.mean()  # water is darker than the sky it reflects
    assert sea_part.std(axis=(0, 1)).min() > 0.02  # and is no blank sheet
    assert np.median(sea_part[..., 2]) > np.median(sea_part[..., 0])
