"""Frames of 256 x 256 vertices: seconds for a hundred, and memory that does not grow with them."""

import os
import resource
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import bemwave
from bemwave.case.output import Frames as Entry
from bemwave.frames import Crests, FrameWriter, MovingSurface, grid_sheet
from bemwave.running.solution import nothing_solved
from bemwave.waves import make_sea, sea_above_band

SIDE = {"size": [255.0, 255.0]}


def writer(folder, frames, formats, displaced):
    spectrum = {"depth": 40.0, "height": 2.0, "period": 8.0, "spreading": 10.0}
    sea = make_sea("jonswap", **spectrum) + sea_above_band("jonswap", 5.0, **spectrum)
    sheet = grid_sheet((0.0, 0.0), SIDE["size"], 1.0)
    crests = Crests(sheet, (), 1.0) if displaced else None
    entry = Entry(end=(frames - 1) / 24, formats=formats, region=SIDE, shading=True)
    return FrameWriter(entry, MovingSurface(sheet, sea, None, crests=crests), [], folder)


def write(frames):
    for time in frames.times[frames.count :]:
        frames.write(nothing_solved(float(time)))


@pytest.mark.parametrize("formats", [("usd",), ("ply",)], ids=lambda f: f[0])
def test_a_hundred_frames(benchmark, tmp_path, formats):
    frames = writer(tmp_path, 100, formats, displaced=True)
    benchmark.pedantic(write, (frames,), rounds=1)
    assert frames.count == 100


@pytest.mark.slow
def test_memory_does_not_grow_with_the_frames(tmp_path):
    pytest.importorskip("pxr")
    # in a process of its own: the greatest memory of this one may be of another test
    home = str(Path(bemwave.__file__).parents[1])
    command = [sys.executable, __file__, str(tmp_path)]
    environment = {**os.environ, "PYTHONPATH": home}
    told = subprocess.run(command, check=True, env=environment, capture_output=True, text=True)
    one = 256 * 256 * 11 * np.dtype(np.float32).itemsize  # what a frame puts into the file
    assert (tmp_path / "many" / "surface.usdc").stat().st_size > 55 * one
    assert int(told.stdout) < 25 * one  # eight frames are moved at once, and some are in flight


def grown(folder):
    """How much more memory sixty frames take than six, bytes."""
    write(writer(folder / "few", 6, ("usd",), displaced=False))
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    write(writer(folder / "many", 60, ("usd",), displaced=False))
    return 1024 * (resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before)


if __name__ == "__main__":
    print(grown(Path(sys.argv[1])))
