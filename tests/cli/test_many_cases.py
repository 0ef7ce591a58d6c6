"""Small cases of every sort run to their end at the command line, and what they write is whole."""

from __future__ import annotations

import math
from pathlib import Path

import netCDF4
import numpy as np
import pytest

from bemwave.cli import status_of
from bemwave.records import open_run

WATER = "[water]\ndepth = 3.0\n"
SURFACE = "[surface]\nsize = [8.0, 6.0]\nspacing = 0.9\n"
CIRCLE = '[surface]\noutline = "circle"\nsize = 8.0\nspacing = 0.9\n'
RUN = "[run]\nduration = 1.0\nrecord_every = 0.1\nramp = 0.5\n"
HUMP = "[[hump]]\nheight = 0.05\nwidth = 1.2\n"
PATCH = "[[pressure]]\nhead = 0.02\nwidth = 1.2\ncentre = [-2.0, 0.0]\nvelocity = [1.0, 0.0]\n"
WAVES = '[[waves]]\nkind = "regular"\nheight = 0.1\nperiod = 2.5\n'
GROUP = (
    '[[waves]]\nkind = "group"\nspectrum = "jonswap"\nheight = 0.3\nperiod = 2.5\n'
    "focus = [0.0, 0.0, 1.0]\ncomponents = 50\n"
)
BALL = (
    '[[body]]\nname = "ball"\nform = "sphere"\nradius = 0.6\ncentre_depth = 1.4\n'
    "panel_size = 0.5\n"
)
SWAYS = 'attitude = "forced"\nforced = { mode = "sway", amplitude = 0.1, period = 2.5 }\n'
GAUGE = "[[gauge]]\nposition = [1.0, 1.0]\ndeck = 1.0\n"
BOX = (
    '[[handoff]]\nname = "box"\nbox = { size = [4.0, 3.0], bottom = -2.5, top = 0.5 }\n'
    "spacing = 0.5\nstart = 0.5\nevery = 0.1\n"
)
FRAMES = '[frames]\nformats = ["ply", "vtk"]\nfps = 5\n'

CASES = {
    "hump, round open water": CIRCLE + HUMP + GAUGE,
    "hump, round tank": CIRCLE + 'edges = "wall"\n' + HUMP + GAUGE + BOX,
    "patch": SURFACE + PATCH + GAUGE + BOX,
    "channel": SURFACE + 'edges = { y_min = "wall", y_max = "wall" }\n' + WAVES + BALL + BOX,
    "corner": SURFACE + 'edges = { y_min = "wall", x_max = "wall" }\n' + WAVES + HUMP + BOX,
    "wall": SURFACE + 'edges = { x_max = "wall" }\n' + WAVES + BALL + GAUGE,
    "forced": SURFACE + BALL + SWAYS + BOX + "zone = 1.0\nvolume_at_start = true\n" + FRAMES,
    "moved by a file": SURFACE + BALL + 'attitude = "sways.csv"\n' + WAVES + FRAMES,
    "stretched": SURFACE + WAVES + BALL + BOX + 'crest = "wheeler"\nfield = "parts"\n',
    "cut": SURFACE + WAVES + BALL + BOX + 'crest = "cut"\n',
    "incident": SURFACE + WAVES + BALL + BOX + 'field = "incident"\n',
    "box under water": SURFACE + WAVES + BALL + BOX.replace("top = 0.5", "top = -0.2"),
    "box to the bed": SURFACE + WAVES + BALL + BOX.replace("-2.5", "-3.0"),
    "placed": SURFACE + WAVES + BALL + BOX
    + 'place = { origin = [1.0, 2.0, 0.0], heading = 20.0, up = "y", time_zero = 1.0 }\n',
    "points": SURFACE + WAVES + BALL + '[[handoff]]\nname = "box"\npoints = "cells.csv"\n'
    "every = 0.1\n",
    "still": SURFACE + GAUGE,
    "sea alone": SURFACE + WAVES + BOX + FRAMES,
    "group": SURFACE + GROUP + GAUGE,
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_it_runs_and_what_it_writes_is_whole(name: str, tmp_path: Path) -> None:
    case = tmp_path / "case.toml"
    case.write_text(WATER + RUN + CASES[name])
    (tmp_path / "cells.csv").write_text("x,y,z\n0,0,-0.5\n1,1,0.02\n0,0,-1.4\n")
    rows = [f"{t / 5},0,{math.sin(t / 2) / 10:.6f},0,0,0,0" for t in range(6)]
    (tmp_path / "sways.csv").write_text("\n".join(["t,surge,sway,heave,roll,pitch,yaw", *rows]))
    assert status_of(["plan", str(case)]) == 0
    assert status_of(["run", str(case)]) == 0
    run = open_run(tmp_path / "case-run")
    assert run.manifest.status == "finished"
    assert run.times == pytest.approx(np.arange(11) / 10)
    assert np.isfinite(run.elevation(0.5, -0.5, run.times)).all()
    for entry in run.case.handoff:
        with netCDF4.Dataset(run.folder.handoff / f"{entry.name}.nc") as file:
            file.set_auto_mask(False)
            wet = np.asarray(file["wet"][:]) > 0.0
            assert wet.any()
            for variable in ("u", "v", "w", "p"):
                assert (np.isfinite(np.asarray(file[variable][:])) == wet).all()
    if run.case.gauge:
        with netCDF4.Dataset(run.folder.gauges) as file:
            assert np.isfinite(np.asarray(file["gap"][:])).all()
    if run.case.frames is not None:
        names = {path.name for path in run.folder.frames.glob("surface*")}
        numbered = {f"surface_{k:05d}.{end}" for k in range(1, 7) for end in ("ply", "vtp")}
        assert names == numbered | {"surface.pvd"}
