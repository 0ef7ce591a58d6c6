"""Each kind of wrong input beyond the case file: its sentence, exit code 2, no run folder left."""

from __future__ import annotations

import struct
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from bemwave.cli import status_of

GOOD = """\
[water]
depth = 10.0
[[waves]]
kind = "regular"
height = 0.3
period = 3.5
[surface]
size = [30.0, 20.0]
spacing = 1.5
[[body]]
name = "barge"
mesh = "barge.stl"
[run]
duration = 10.0
"""
BODY = '[[body]]\nname = "barge"\nmesh = "barge.stl"\n'
WAVES = '[[waves]]\nkind = "regular"\nheight = 0.3\nperiod = 3.5\n'
HUMP = "[[hump]]\nheight = 0.1\nwidth = 2.0\n"
POINTS = '[[handoff]]\nname = "cells"\npoints = "cells.csv"\n'

CORNERS = np.array([[x, y, z] for z in (-1, 1) for y in (-2, 2) for x in (-4, 4)], dtype=float)
SIDES = [(0, 2, 3, 1), (4, 5, 7, 6), (0, 1, 5, 4), (2, 6, 7, 3), (0, 4, 6, 2), (1, 3, 7, 5)]


def box(*, corners: np.ndarray = CORNERS) -> np.ndarray:
    """Triangles (12, 3, 3) of a closed box 8 x 4 x 2 m half under water, facing out."""
    quads = corners[np.array(SIDES)]
    return np.concatenate([quads[:, [0, 1, 2]], quads[:, [0, 2, 3]]])


def stl(triangles: np.ndarray) -> bytes:
    rows = b"".join(struct.pack("<12fH", 0, 0, 0, *t.ravel(), 0) for t in triangles)
    return bytes(80) + struct.pack("<I", len(triangles)) + rows


def text_stl(triangles: np.ndarray) -> str:
    vertex = "  vertex {} {} {}\n"
    facets = (
        " facet normal 0 0 0\n outer loop\n"
        + "".join(vertex.format(*p) for p in t)
        + " endloop\n endfacet\n"
        for t in triangles
    )
    return "solid barge\n" + "".join(facets) + "endsolid barge\n"


def moved(points: np.ndarray, x: float, y: float, z: float) -> np.ndarray:
    return points + np.array([x, y, z])


BOX = box()
Files = dict[str, bytes | str]


def barge(triangles: np.ndarray) -> Files:
    return {"barge.stl": stl(triangles)}


def swap(old: str, new: str, text: str = GOOD) -> str:
    assert old in text
    return text.replace(old, new)


def edged(edges: str, text: str = GOOD) -> str:
    return swap("spacing = 1.5\n", f"spacing = 1.5\nedges = {edges}\n", text)


BARE = swap(BODY, HUMP)  # no body
SHEET = swap("spacing = 1.5\n", 'spacing = 1.5\nmesh = "water.stl"\n', BARE)
TABLE = swap(WAVES, '[[waves]]\nkind = "table"\nfile = "waves.csv"\n', BARE)
BLOCK = 'form = "box"\nlength = 8.0\nbeam = 4.0\ndraught = 1.0\n'
FACES = "[[handoff]]\nbox = { size = [20.0, 10.0], bottom = -5.0, top = 1.0 }\n"
BALL = """\
[[body]]
name = "ball"
form = "sphere"
radius = 1.0
centre_depth = 3.0
attitude = "forced"
forced = { mode = "heave", amplitude = 0.1, period = 2.0 }
"""

FOLDED = BOX.copy()
FOLDED[5] = FOLDED[5, ::-1]
Y_UP = moved(CORNERS, 0, 0, 1)[:, [0, 2, 1]] * [1, 1, -1]

# what was done; the case; the files beside it; the sentence
BAD: dict[str, tuple[str, Files, str]] = {
    "no such mesh": (
        GOOD, {}, "barge.stl: there is no such mesh file; check the name and the folder",
    ),
    "a mesh format not read": (
        swap("barge.stl", "barge.xyz"), {"barge.xyz": "1 2 3"}, "barge.xyz",
    ),
    "a binary STL cut off": (
        GOOD, {"barge.stl": stl(BOX)[:-60]}, "it is cut off or damaged; write it out again",
    ),
    "a text STL cut off": (
        GOOD, {"barge.stl": text_stl(BOX)[:-300]}, "breaks off after 9 triangles",
    ),
    "no mesh at all": (GOOD, {"barge.stl": "hello"}, "barge.stl"),
    "a hole": (
        GOOD, barge(BOX[1:]),
        "3 edges belong to one triangle only (a hole), the first near (-4, 0, -1); close the hole",
    ),
    "a flipped triangle": (GOOD, barge(FOLDED), "face opposite ways (flipped normals)"),
    "inside out": (GOOD, barge(BOX[:, ::-1]), "1 of 1 connected pieces are inside out"),
    "doubled plating": (
        GOOD, barge(np.concatenate([BOX, BOX[:1]])), "edges belong to three or more triangles",
    ),
    "hulls through each other": (
        GOOD, barge(np.concatenate([BOX, moved(BOX, 1.0, 0.7, 0.3)])),
        "edges pass through other triangles (self-intersection)",
    ),
    "in millimetres": (
        GOOD, barge(1000.0 * BOX),
        "it measures 8000 x 4000 x 2000 m; if the file is in millimetres give scale = 0.001",
    ),
    "y up": (
        GOOD, barge(box(corners=Y_UP)[:, ::-1]), 'as a hull with y up is; give up = "y"',
    ),
    "above water": (
        GOOD, barge(moved(BOX, 0, 0, 5)),
        "the whole hull lies above still water (z from 4 to 6 m); give its draught",
    ),
    "a draught deeper than the hull": (
        swap('"barge.stl"\n', '"barge.stl"\ndraught = 3.0\n'), barge(BOX),
        "with draught = 3 the whole hull is under water",
    ),
    "a part that is not there": (
        swap('"barge.stl"\n', '"barge.stl"\nwithout = ["rudder"]\n'), barge(BOX),
        "without names 'rudder', and its parts are piece1; use one of these",
    ),
    "panels of a micrometre": (
        swap('mesh = "barge.stl"', BLOCK + "panel_size = 1e-6"), {},
        "are the most that are meshed: give a larger one",
    ),
    "a body over the edge": (
        swap('mesh = "barge.stl"', BLOCK + "panel_size = 1.0\nposition = [13.0, 0.0]"), {},
        ", outside the water surface, the rectangle x -15 to 15, y -10 to 10: move it",
    ),
    "bodies that overlap": (
        swap(BODY, "".join(
            f'[[body]]\nname = "{name}"\n{BLOCK}panel_size = 1.0\nposition = [{x}, 0.0]\n'
            for name, x in (("one", 0.0), ("two", 5.0))
        )),
        {}, "one and two overlap near (2.5, 0): change the position of one of them",
    ),
    "a box outside the surface": (
        GOOD + FACES.replace("20.0", "40.0"),
        barge(BOX), "reaches outside the useful water (-15 <= x <= 15, -10 <= y <= 10)",
    ),
    "walls all round in deep water": (
        swap("depth = 10.0", 'depth = "deep"', edged('"wall"', swap(WAVES, "", BARE))),
        {}, 'depth = "deep" with walls all round; expected a depth in metres',
    ),
    "waves in a closed basin": (
        edged('{ x_max = "wall", y_min = "wall", y_max = "wall" }'),
        barge(BOX), "[[waves]] are given in water that walls close",
    ),
    "waves across a channel": (
        swap(
            "period = 3.5", "period = 3.5\nheading = 10.0",
            edged('{ y_min = "wall", y_max = "wall" }'),
        ),
        barge(BOX), "expected long-crested waves along the channel",
    ),
    "panels too large for the waves": (
        swap("spacing = 1.5", "spacing = 9.0", swap(BODY, BALL)),
        {}, "give [surface] spacing 1.04 m or less",
    ),
    "more triangles than fit": (
        swap("spacing = 1.5", 'spacing = 0.1\nroute = "panels"', BARE),
        {}, "[surface] spacing = 0.1 m makes",
    ),
    "a memory limit that is too small": (
        swap("[run]\n", "[run]\nmemory_limit = 0.2\n", BARE),
        {}, "GB; expected at most 20000 triangles and 0.2 GB: about spacing = ",
    ),
    "a box of too many points": (
        BARE + FACES + "spacing = 0.001\n",
        {}, '[[handoff]] "handoff1" spacing = 0.001 m makes',
    ),
    "frames of too many points": (
        BARE + "[frames]\nregion = { size = [20.0, 10.0] }\nspacing = 0.001\n",
        {}, "[frames] spacing = 0.001 m makes 2e+08 points; expected at most 5e+06",
    ),
    "no such points": (
        BARE + POINTS, {}, "cells.csv was given for points; there is no such file",
    ),
    "points without a header": (
        BARE + POINTS, {"cells.csv": "1,2,3\n"},
        "cells.csv, line 1: got '1,2,3', expected the header x,y,z",
    ),
    "a point that is no numbers": (
        BARE + POINTS, {"cells.csv": "x,y,z\n1,2,-3\n1,2\n"},
        "cells.csv, line 3: got '1,2', expected three numbers x,y,z",
    ),
    "points outside the water": (
        BARE + POINTS, {"cells.csv": "x,y,z\n0,0,-1\n99,0,-1\n"},
        "cells.csv has 1 points outside the useful water, the first at (99, 0)",
    ),
    "points below the bed": (
        BARE + POINTS, {"cells.csv": "x,y,z\n0,0,-11\n"},
        "cells.csv has 1 points below the bed, the lowest at z = -11",
    ),
    "a wave table without rows": (
        TABLE,
        {"waves.csv": "frequency_rad_s,density_m2s\n"}, "has no rows under its header",
    ),
    "a wave table that is missing": (
        TABLE,
        {}, "waves.csv",
    ),
    "a ready sheet that is missing": (
        SHEET,
        {}, "water.stl: there is no such mesh file",
    ),
    "a ready sheet of another size": (
        SHEET,
        {"water.stl": stl(BOX[[0, 6]] * [1, 1, 0])}, "[surface] mesh = 'water.stl' reaches from",
    ),
    "a ready sheet that is not flat": (
        SHEET,
        {"water.stl": stl(BOX * [28.5 / 4, 23.5 / 2, 1.0])},
        "water.stl reaches |z| = 1 m; the water surface must be flat",
    ),
}  # fmt: skip


@pytest.fixture
def at(tmp_path: Path) -> Callable[[str, Files], Path]:
    def write(text: str, files: Files) -> Path:
        for name, content in files.items():
            content = content.encode() if isinstance(content, str) else content
            (tmp_path / name).write_bytes(content)
        (tmp_path / "case.toml").write_text(text)
        return tmp_path / "case.toml"

    return write


def refused(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> str:
    """The one line of an error with exit code 2."""
    status = status_of(arguments)
    told = capsys.readouterr()
    assert status == 2, told
    assert told.err.startswith("error: ")
    assert told.err.count("\n") == 1, told.err
    assert told.out == ""
    return told.err


@pytest.mark.parametrize("name", BAD)
def test_bad_input_is_told_in_a_line_and_nothing_is_left(
    name: str, at: Callable[[str, Files], Path], capsys: pytest.CaptureFixture[str]
) -> None:
    text, files, expected = BAD[name]
    case = at(text, files)
    before = sorted(case.parent.iterdir())
    error = refused(["run", str(case)], capsys)
    assert expected in error
    assert refused(["plan", str(case)], capsys) == error
    assert sorted(case.parent.iterdir()) == before


def test_a_step_that_is_too_long_is_refused_before_the_folder_is_made(
    at: Callable[[str, Files], Path], capsys: pytest.CaptureFixture[str]
) -> None:
    case = at(swap("[run]\n", "[run]\nstep = 5.0\n", BARE), {})
    assert "[run] step = 5 s is longer than this mesh allows; expected at most" in refused(
        ["run", str(case)], capsys
    )
    assert not case.with_name("case-run").exists()


def test_where_a_run_cannot_go(
    at: Callable[[str, Files], Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    case = str(at(BARE, {"file": ""}))
    told = refused(["run", case, "--out", str(tmp_path / "file")], capsys)
    assert f"{tmp_path / 'file'} is a file; expected a folder for the run" in told
    told = refused(["run", case, "--out", str(tmp_path / "file" / "run")], capsys)
    assert f"{tmp_path / 'file'} is no folder that can be written to" in told


def test_a_faulty_hull_is_inspected_and_ends_in_1(
    at: Callable[[str, Files], Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    at(GOOD, barge(BOX[1:]))
    assert status_of(["mesh", str(tmp_path / "barge.stl")]) == 1
    told = capsys.readouterr().out
    assert "fault: 3 edges belong to one triangle only (a hole)" in told
    error = refused(["mesh", str(tmp_path / "barge.stl"), "--cut"], capsys)
    assert "barge.stl, under water: 3 edges belong to one triangle only" in error


def test_a_sound_hull_is_measured_and_written(
    at: Callable[[str, Files], Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    at(GOOD, barge(moved(1000.0 * BOX, 0, 0, 7000)))
    arguments = ["--scale", "0.001", "--draught", "0.5", "--cut", "--out", str(tmp_path / "w.vtp")]
    assert status_of(["mesh", str(tmp_path / "barge.stl"), *arguments]) == 0
    told = capsys.readouterr().out
    for label, value, unit in (
        ("length", [8.0], "m"),
        ("beam", [4.0], "m"),
        ("draught", [0.5], "m"),
        ("displaced volume", [16.0], "m3"),
        ("waterplane area", [32.0], "m2"),
        ("centre of buoyancy", [0.0, 0.0, -0.25], "m"),
    ):
        (line,) = (line for line in told.splitlines() if line.startswith(f"{label}  "))
        figures, found = line.removeprefix(label).rsplit(maxsplit=1)
        assert [float(word) for word in figures.split(",")] == pytest.approx(value, abs=1e-9)
        assert found == unit
    assert "no faults found" in told
    assert status_of(["mesh", str(tmp_path / "w.vtp")]) == 0
    assert "displaced volume     16" in capsys.readouterr().out
