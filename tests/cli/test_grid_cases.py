"""Route "grid" at the command line: what runs on it, what is refused and in which words."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import bemwave
from bemwave.cli import status_of
from bemwave.errors import InputError
from bemwave.running.check import check

WATER = """\
[water]
depth = 3.0
[surface]
size = [8.0, 7.0]
spacing = 0.25
route = "grid"
absorber = 4.0
[run]
duration = 3.0
record_every = 0.25
[[gauge]]
position = [1.0, 0.5]
[[handoff]]
box = { size = [4.0, 4.0], bottom = -2.9, top = 0.5 }
spacing = 0.2
every = 0.25
start = 1.0
"""
WAVES = '[[waves]]\nkind = "regular"\nheight = 0.05\nperiod = 1.8\n'
HUMP = "[[hump]]\nheight = 0.05\nwidth = 0.8\n"
BALL = '[[body]]\nname = "ball"\nform = "sphere"\nradius = 0.5\npanel_size = 0.3\n'

RUNS = {
    "sea alone": WATER + WAVES,
    "hump alone": WATER + HUMP,
    "patch alone": WATER + "[[pressure]]\nhead = 0.05\nwidth = 0.8\nvelocity = [0.5, 0.0]\n",
    "round water": WATER.replace("[8.0, 7.0]", '8.0\noutline = "circle"') + HUMP,
    "sphere under water": WATER + WAVES + BALL + "centre_depth = 1.3\n",
    "pile": WATER
    + WAVES
    + '[[body]]\nname = "pile"\nform = "cylinder"\nradius = 0.75\ndraught = "bed"\n'
    + "panel_size = 0.3\n",
    "ball moved by file": WATER.replace("absorber = 4.0\n", "").replace("= 0.2\n", "= 0.1\n")
    + BALL.replace("0.5", "0.75")
    + 'attitude = "motions.csv"\n',
}


def motions(folder: Path) -> None:
    rows = ["t,surge,sway,heave,roll,pitch,yaw"]
    times = np.arange(0.0, 3.3, 0.15)
    rows += [f"{t:.2f},0,0,{0.03 * np.sin(3.4 * t) * min(1.0, t):.6f},0,0,0" for t in times]
    (folder / "motions.csv").write_text("\n".join(rows) + "\n")


@pytest.mark.parametrize("kind", RUNS)
def test_it_is_planned_run_checked_opened_and_reported(
    kind: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    case, folder = tmp_path / "case.toml", tmp_path / "case-run"
    case.write_text(RUNS[kind])
    motions(tmp_path)
    assert status_of(["plan", str(case)]) == 0
    assert "grid (named in the case)" in capsys.readouterr().out
    assert status_of(["run", str(case)]) == 0
    assert status_of(["check", str(folder)]) == 0
    told = capsys.readouterr()
    assert told.err == ""
    assert " fail " not in told.out
    if kind != "sea alone":
        assert "exact in space and time" in told.out
    run = bemwave.open_run(folder)
    level = run.elevation([1.0, 3.0], 0.5, [1.0, 2.0])
    assert np.isfinite(level).all()
    assert np.abs(level).max() > 1e-4
    assert np.isfinite(run.velocity([[1.0, 1.0, -0.2]], 2.0)).all()
    assert status_of(["report", str(folder)]) == 0
    assert (folder / "report.html").stat().st_size > 10_000


def test_the_run_again_on_a_coarser_grid(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    case = tmp_path / "case.toml"
    case.write_text(
        RUNS["hump alone"].replace("[run]", "[run]\nhistory_region = { size = [4.0, 3.0] }")
    )
    assert status_of(["run", str(case)]) == 0
    assert status_of(["check", str(tmp_path / "case-run"), "--convergence"]) == 0
    assert "convergence" in capsys.readouterr().out
    run = bemwave.open_run(tmp_path / "case-run")
    assert np.isfinite(run.elevation(1.0, 0.5, 2.0))
    with pytest.raises(InputError, match=r"\(3.5, 0\), outside \[run\] history_region"):
        run.elevation(3.5, 0.0, 2.0)
    with pytest.raises(InputError, match="velocities were asked for of a run with"):
        run.velocity([[0.5, 0.0, -0.5]], 2.0)


NAMED = '[surface] route = "grid" was given, and '
OR_PANELS = ', or write route = "panels"'
BOX = '[[body]]\nname = "{0}"\nform = "box"\nlength = {1}\nbeam = {2}\ndraught = 0.5\n'
FRAMES = '[frames]\nformats = ["ply"]\nstart = 2.0\n'

REFUSED = {
    "thin plate": (
        WATER + BOX.format("plate", 3.0, 0.1),
        NAMED + "the waterplane of plate is 0.1 m across at (1.44, 0, 0); expected 3 spacings or "
        "more (0.75 m): give [surface] spacing 0.0333 m or less" + OR_PANELS,
    ),
    "narrow gap": (
        WATER
        + BOX.format("near", 2.0, 1.0)
        + BOX.format("far", 2.0, 1.0)
        + "position = [0.0, 1.6]\n",
        NAMED + "the water between near and far is 0.6 m",
    ),
    "shallow cover": (
        WATER + BALL + "centre_depth = 0.7\n",
        NAMED + "the water over ball is 0.173 m deep",
    ),
    "wall": (
        WATER.replace("absorber", 'edges = { x_min = "wall" }\nabsorber') + WAVES,
        NAMED + 'there are walls at x_min; expected open edges: write edges = "absorb"' + OR_PANELS,
    ),
    "ready mesh": (
        WATER.replace("absorber", 'mesh = "water.vtu"\nabsorber') + WAVES,
        NAMED + "[surface] mesh = 'water.vtu' is given; expected none: take it out" + OR_PANELS,
    ),
    "too little memory": (
        WATER.replace("[run]", "[run]\nmemory_limit = 0.2") + HUMP,
        "[surface] spacing = 0.25 m makes 4096 nodes, which need",
    ),
    "frames without a region": (
        WATER + WAVES + FRAMES,
        "[frames] was given without a region on route grid, which has no panels to draw; expected "
        "[frames] region = { size = [along x, along y] } and a spacing",
    ),
    "region of the history on panels": (
        WATER.replace('"grid"', '"panels"').replace(
            "[run]", "[run]\nhistory_region = { size = [4.0, 3.0] }"
        )
        + WAVES,
        "[run] history_region was given on route panels; expected it on the grid alone",
    ),
}  # fmt: skip


@pytest.mark.parametrize("command", ["plan", "run"])
@pytest.mark.parametrize("kind", REFUSED)
def test_what_the_grid_cannot_hold_is_told_in_one_sentence_and_nothing_is_written(
    kind: str, command: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    text, expected = REFUSED[kind]
    case = tmp_path / "case.toml"
    case.write_text(text)
    status = status_of([command, str(case)])
    told = capsys.readouterr()
    assert told.err.startswith(f"error: {expected}")
    assert told.err.count("\n") == 1
    assert told.out == ""
    assert status == 2
    assert list(tmp_path.iterdir()) == [case]


def test_convergence_says_when_the_coarser_grid_does_not_take_the_case(tmp_path):
    short = WATER.partition("[[gauge]]")[0].replace("3.0\nrecord", "1.0\nrecord")
    case = tmp_path / "case.toml"
    case.write_text(short + WAVES + BALL)
    bemwave.run(bemwave.read_case(case), tmp_path / "run")
    told = r"^--convergence solves the case again with 1.5 times its sizes, and then: .*waterplane"
    with pytest.raises(InputError, match=told):
        check(tmp_path / "run", convergence=True)
