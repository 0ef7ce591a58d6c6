"""Cases that interrupted runs are tried on: one list, which every feature with a state joins."""

from __future__ import annotations

import filecmp
import os
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest

from bemwave import cli
from bemwave.case import Case
from bemwave.running import loop, run

TANK = """\
[water]
depth = 1.0
[surface]
size = [4.0, 1.5]
spacing = 0.4
edges = { x_min = "wall", x_max = "absorb", y_min = "wall", y_max = "wall" }
absorber = 2.0
[[wavemaker]]
side = "x_min"
kind = "flap"
stroke = 0.02
period = 1.6
[run]
duration = 4.0
record_every = 0.1
[[gauge]]
position = [0.0, 0.0]
[[handoff]]
name = "box"
box = { size = [1.5, 0.6], bottom = -0.4, top = 0.2 }
start = 2.0
every = 0.1
volume_at_start = true
[frames]
formats = ["ply", "vtk"]
start = 2.0
fps = 5
"""

SPHERE = """\
[water]
depth = "deep"
[[waves]]
kind = "regular"
height = 0.1
period = 1.8
[surface]
size = [4.0, 3.0]
spacing = 0.7
absorber = 2.8
[[body]]
name = "ball"
form = "sphere"
radius = 0.4
centre_depth = 1.0
panel_size = 0.4
attitude = "forced"
forced = { mode = "heave", amplitude = 0.05, period = 1.8 }
[run]
duration = 4.0
record_every = 0.1
[[gauge]]
position = [0.5, 0.0]
[[handoff]]
name = "box"
box = { size = [3.0, 2.0], bottom = -0.5, top = 0.2 }
start = 3.0
every = 0.1
crest = "wheeler"
field = "parts"
"""

MOVED_BY_FILE = SPHERE.replace(
    'attitude = "forced"\nforced = { mode = "heave", amplitude = 0.05, period = 1.8 }',
    'attitude = "motions.csv"',
)
MOVED_BY_FILE += """\
[frames]
formats = ["usd", "obj", "glb"]
start = 2.0
fps = 5
region = { size = [4.0, 3.0] }
spacing = 0.25
horizontal_displacement = true
shading = true
"""

SEA_ALONE = """\
[water]
depth = 5.0
[[waves]]
kind = "jonswap"
height = 0.1
period = 2.0
components = 50
[surface]
size = [8.0, 4.0]
spacing = 0.5
[run]
duration = 4.0
[[gauge]]
position = [0.0, 0.0]
[[handoff]]
name = "box"
box = { size = [2.0, 2.0], bottom = -1.0, top = 0.5 }
spacing = 0.5
every = 0.1
[frames]
formats = ["usd", "ply"]
fps = 5
end = 3.0
region = { size = [4.0, 3.0] }
spacing = 0.1
displacement_maps = true
"""

RIDER = """\
[[body]]
name = "buoy"
form = "cylinder"
radius = 0.2
draught = 0.2
position = [1.0, 0.8]
attitude = "follow"
"""
SEA_ALONE += RIDER
MOVED_BY_FILE += RIDER

PICTURES = (
    TANK.replace('["ply", "vtk"]', '["usd", "obj", "glb", "ply", "vtk"]')
    .replace("start = 2.0\nfps = 5", "start = 1.0\nfps = 5")
    .replace("volume_at_start = true\n", "")
    + """\
region = { size = [3.0, 1.0] }
spacing = 0.2
shading = true
displacement_maps = true
horizontal_displacement = true
"""
)

GRID = """\
[water]
depth = "deep"
[[waves]]
kind = "regular"
height = 0.05
period = 1.8
[surface]
size = [8.0, 6.0]
spacing = 0.25
route = "grid"
absorber = 4.0
[[body]]
name = "ball"
form = "sphere"
radius = 0.5
panel_size = 0.3
attitude = "forced"
forced = { mode = "heave", amplitude = 0.03, period = 1.8 }
[run]
duration = 4.0
record_every = 0.1
[[gauge]]
position = [1.0, 0.0]
[[handoff]]
name = "box"
box = { size = [3.0, 2.0], bottom = -1.0, top = 0.2 }
start = 3.0
every = 0.1
field = "parts"
volume_at_start = true
[frames]
formats = ["ply"]
start = 3.0
fps = 5
region = { size = [4.0, 3.0] }
spacing = 0.25
horizontal_displacement = true
shading = true
"""

GRID_HUMP = """\
[water]
depth = "deep"
[[hump]]
height = 0.05
width = 0.8
[surface]
size = [8.0, 8.0]
spacing = 0.25
route = "grid"
absorber = 3.0
[run]
duration = 4.0
record_every = 0.1
history_region = { size = [4.0, 3.0] }
[[gauge]]
position = [1.0, 0.0]
[[handoff]]
name = "box"
box = { size = [3.0, 2.0], bottom = -1.0, top = 0.2 }
start = 3.0
every = 0.1
"""

GRID_HUMP += RIDER

GRID_MOVED = (
    GRID.replace('depth = "deep"', "depth = 3.0")
    .replace(
        'attitude = "forced"\nforced = { mode = "heave", amplitude = 0.03, period = 1.8 }',
        'attitude = "motions.csv"',
    )
    .replace("[run]\n", "[run]\nhistory_region = { size = [4.0, 3.0] }\n")
    .replace("start = 3.0\nfps = 5", "start = 2.0\nfps = 5")
    .replace(
        'formats = ["ply"]', 'formats = ["usd", "obj", "vtk", "glb"]\ndisplacement_maps = true'
    )
    + """\
[[handoff]]
name = "cells"
points = "cells.csv"
start = 2.0
every = 0.1
crest = "cut"
place = { up = "y", heading = 30.0 }
[[pressure]]
head = 0.01
width = 0.6
centre = [-2.0, 0.0]
velocity = [0.5, 0.2]
"""
    + RIDER.replace("[1.0, 0.8]", "[1.0, -1.5]")
)

GRID_SINGLE = GRID.replace("[run]\n", '[run]\nprecision = "single"\n')

# a later route, body or frame format adds its case here, and every test of interruptions tries it
CASES = {
    "tank": TANK,
    "sphere": SPHERE,
    "moved by file": MOVED_BY_FILE,
    "sea alone": SEA_ALONE,
    "pictures": PICTURES,
    "grid": GRID,
    "hump on the grid": GRID_HUMP,
    "grid, moved by file": GRID_MOVED,
    "grid, single": GRID_SINGLE,
}


def write_case(name: str, folder: Path) -> Path:
    """Write a case of the list, and the files that it names."""
    (folder / "case.toml").write_text(CASES[name])
    if "motions.csv" in CASES[name]:
        rows = ["t,surge,sway,heave,roll,pitch,yaw"]
        rows += [
            f"{t:.2f},0,0,{0.05 * np.sin(3.4 * t) * min(1.0, t):.6f},0,0,0"
            for t in np.arange(0.0, 4.25, 0.25)
        ]
        (folder / "motions.csv").write_text("\n".join(rows) + "\n")
    if "cells.csv" in CASES[name]:
        (folder / "cells.csv").write_text("x,y,z\n1.5,0.5,-0.3\n1.5,0.5,0.01\n-1.5,0.0,-0.1\n")
    return folder / "case.toml"


def arrays_of(path: Path) -> dict[str, np.ndarray]:
    """All arrays of a netCDF file, as they are stored."""
    with netCDF4.Dataset(path) as file:
        file.set_auto_mask(False)
        arrays = {name: np.asarray(file[name][:]) for name in file.variables}
    # text comes as objects, whose bytes are addresses
    return {name: a.astype(str) if a.dtype == object else a for name, a in arrays.items()}


def assert_same(one: Path, other: Path) -> None:
    """All arrays bit for bit, all other files byte for byte; not log and manifest."""
    files, others = files_of(one), files_of(other)
    assert files == others
    assert {Path("checks.json"), Path("sea.nc")} <= files
    for file in sorted(files):
        if file.suffix == ".nc":
            first, second = arrays_of(one / file), arrays_of(other / file)
            assert first.keys() == second.keys()
            for name, array in first.items():
                assert array.shape == second[name].shape, (file, name)
                assert array.tobytes() == second[name].tobytes(), (file, name)
        else:
            assert filecmp.cmp(one / file, other / file, shallow=False), file


def files_of(folder: Path) -> set[Path]:
    """What must be the same however often a run was interrupted."""
    files = {p.relative_to(folder) for p in folder.rglob("*") if p.is_file()}
    return {p for p in files if p.parts[0] not in ("checkpoint", "log.txt", "manifest.json")}


def assert_readable(folder: Path) -> None:
    """Every file of records opens, and what it says is written can be read."""
    for path in folder.rglob("*.nc"):
        if path.stem.endswith(".part"):
            continue  # what a writing left that was broken off; it is no file of the run
        with netCDF4.Dataset(path) as file:
            for variable in file.variables.values():
                variable[:]  # checksums are tried
            if "written" in file.variables:
                written = np.asarray(file["written"][:])
                assert (np.diff(written) <= 0).all()  # whole records first, the others after


def command(
    *arguments: str, cwd: Path, prepare: Callable[[], None] | None = None
) -> subprocess.Popen[str]:
    """Start bemwave in a process of its own."""
    environment = {**os.environ, "PYTHONPATH": str(Path(cli.__file__).parents[1])}
    return subprocess.Popen(
        [sys.executable, "-c", "from bemwave.cli import main; main()", *arguments],
        cwd=cwd,
        env=environment,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        text=True,
        preexec_fn=prepare,
    )


def wait_for(log: Path, words: str, running: subprocess.Popen[str]) -> float:
    """Wait for a line that is new in a log; the moment it came, or the program's end."""
    before = log.read_text().count(words) if log.exists() else 0
    give_up = time.monotonic() + 120.0
    while running.poll() is None and time.monotonic() < give_up:
        if log.exists() and log.read_text().count(words) > before:
            break
        time.sleep(0.005)
    return time.monotonic()


def interrupt_after(visits: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Have the next run hear Ctrl-C after a number of instants."""
    left = [visits]

    @contextmanager
    def heard() -> Iterator[Callable[[], bool]]:
        def came() -> bool:
            return left[0] == 0

        yield came

    def count(*arguments: Any) -> None:
        left[0] -= 1
        check(*arguments)

    check = loop.refuse_no_numbers
    monkeypatch.setattr(loop, "heard", heard)
    monkeypatch.setattr(loop, "refuse_no_numbers", count)


def interrupted(case: Case, out: Path, monkeypatch: pytest.MonkeyPatch, *visits: int) -> None:
    for number, stop in enumerate(visits):
        interrupt_after(stop, monkeypatch)
        with pytest.raises(KeyboardInterrupt):
            run(case, out, resume=number > 0)
        monkeypatch.undo()
