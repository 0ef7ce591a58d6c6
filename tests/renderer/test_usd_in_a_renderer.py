"""surface.usdc in a real renderer's importer, drawn by its CPU renderer.

bpy brings an OpenUSD of its own, so it runs in a Python of its own:

    python3.11 -m venv VENV && VENV/bin/pip install bpy==4.2.0
    BPY_PYTHON=VENV/bin/python .venv/bin/python -m pytest -m renderer tests/renderer
"""

import json
import os
import subprocess
from pathlib import Path

import numpy as np
import pytest
from matplotlib.image import imread

import bemwave
from bemwave.case import Case

pytestmark = pytest.mark.renderer
PYTHON = os.environ.get("BPY_PYTHON")
SCRIPT = Path(__file__).with_name("render_usd.py")
FRAMES = (1, 4, 7)
TENDER = Path(bemwave.__file__).parents[1] / "meshes" / "tender.stl"
MAGENTA = np.array([0.9, 0.0, 0.9])

MOTIONS = ["t,surge,sway,heave,roll,pitch,yaw"] + [
    f"{0.2 * k:g},0,0,{0.1 * np.sin(k / 4):.5f},{6 * np.sin(k / 3):.5f},0,0" for k in range(11)
]


def run(folder, waves):
    """A flared hull that rolls and heaves, in waves or in calm water."""
    (folder / "moved.csv").write_text("\n".join(MOTIONS))
    case = Case(
        water={"depth": 20.0},
        waves=waves,
        surface={"size": [24.0, 20.0], "spacing": 2.0, "fine_spacing": 0.8, "absorber": 16.0},
        body=[{"name": "boat", "mesh": str(TENDER), "scale": 0.4, "draught": 0.76,
               "panel_size": 0.5, "heading": 20.0, "attitude": "moved.csv"}],
        frames={"formats": ["usd"], "fps": 4.0, "end": 1.5, "region": {"size": [60.0, 60.0]},
                "spacing": 0.4, "horizontal_displacement": bool(waves)},
        run={"duration": 2.0, "record_every": 0.5, "ramp": 0.5},
    ).placed(folder)  # fmt: skip
    return bemwave.run(case, folder / "run").folder.frames / "surface.usdc"


@pytest.fixture(scope="module", params=["waves", "calm"])
def seen(request, tmp_path_factory):
    """The file, what the importer measures, and pictures from eight sides at the last frame."""
    if not PYTHON:
        pytest.skip("BPY_PYTHON is not set; see the head of this file")
    folder = tmp_path_factory.mktemp(request.param)
    sea = [{"kind": "jonswap", "height": 0.5, "period": 3.5, "spreading": 10.0,
            "components": 200, "band": [0.7, 1.3]}]  # fmt: skip
    file = run(folder, sea if request.param == "waves" else [])
    angles = np.radians(np.arange(8) * 45.0)
    pictures = [
        {"path": str(folder / f"side{k}.png"), "frame": FRAMES[-1], "target": [0, 0, 0],
         "eye": [14 * np.cos(a), 14 * np.sin(a), 9.0]}
        for k, a in enumerate(angles)
    ]  # fmt: skip
    arguments = [str(file), str(folder / "seen.npz"), ",".join(map(str, FRAMES))]
    command = [PYTHON, str(SCRIPT), *arguments, json.dumps(pictures)]
    subprocess.run(command, check=True, timeout=1500, capture_output=True)
    images = [imread(picture["path"])[..., :3] for picture in pictures]
    return file, dict(np.load(folder / "seen.npz")), images


def test_the_importer_has_the_file_s_points_scale_and_frames(seen):
    pxr = pytest.importorskip("pxr")
    from pxr import Usd, UsdGeom

    file, measured, _ = seen
    assert pxr
    stage = Usd.Stage.Open(str(file))
    water = UsdGeom.Mesh(stage.GetPrimAtPath("/sea/water"))
    boat = UsdGeom.Xformable(stage.GetPrimAtPath("/sea/bodies/boat"))
    for frame in FRAMES:
        points = np.asarray(water.GetPointsAttr().Get(float(frame)))
        np.testing.assert_array_equal(measured[f"water_{frame}"], points)
        np.testing.assert_array_equal(measured[f"water_{frame}_matrix"], np.eye(4))  # metres, z up
        matrix = np.array(boat.ComputeLocalToWorldTransform(float(frame))).T
        np.testing.assert_allclose(measured[f"boat_{frame}_matrix"], matrix, atol=2e-6)
    assert not np.array_equal(measured["boat_1_matrix"], measured["boat_7_matrix"])
    assert measured["span"].tolist() == [1, 7]


def test_from_eight_sides_the_picture_is_water_and_hull_and_no_gap_between(seen):
    _, _, images = seen
    for image in images:
        gap = np.abs(image - MAGENTA).max(axis=2) < 0.3
        hull = image[..., 0] > 1.5 * image[..., 2]
        water = (image[..., 2] > image[..., 0]) & ~gap
        assert water.mean() > 0.5
        assert 0.02 < hull.mean() < 0.4
        assert image[water].std() > 0.002  # waves and slopes, no blank sheet
        # the camera looks down on water alone: magenta could only be seen through a gap
        below_horizon = gap[80:]
        assert below_horizon.sum() == 0
