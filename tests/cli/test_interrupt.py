"""Ctrl-C and SIGTERM at the command line: exit code 130, a message, and a run that goes on."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from bemwave import cli, open_run

TANK = """\
[water]
depth = 1.0
[surface]
size = [4.0, 1.5]
spacing = 0.4
edges = "wall"
[[hump]]
height = 0.02
width = 0.5
[run]
duration = 400.0
record_every = 0.1
"""


BUOY = """\
[water]
depth = 4.0
[[waves]]
kind = "regular"
height = 0.05
period = 2.0
[surface]
size = [8.0, 5.0]
spacing = 0.8
absorber = 3.0
[[body]]
name = "buoy"
form = "cylinder"
radius = 0.6
draught = 0.8
panel_size = 0.4
[run]
duration = 2000.0
"""


def start(*arguments: str, cwd: Path) -> subprocess.Popen[str]:
    environment = {**os.environ, "PYTHONPATH": str(Path(cli.__file__).parents[1])}
    # a shell's background jobs ignore Ctrl-C, and hand that on to what they start
    return subprocess.Popen(
        [sys.executable, "-c", "from bemwave.cli import main; main()", *arguments],
        cwd=cwd,
        env=environment,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),
    )


def wait_for(log: Path, words: str) -> None:
    give_up = time.monotonic() + 120.0
    while not (log.exists() and words in log.read_text()):
        assert time.monotonic() < give_up
        time.sleep(0.05)


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_signal_leaves_a_run_that_goes_on(number: signal.Signals, tmp_path: Path) -> None:
    (tmp_path / "tank.toml").write_text(TANK)
    running = start("run", "tank.toml", cwd=tmp_path)
    wait_for(tmp_path / "tank-run" / "log.txt", "set up in")
    running.send_signal(number)
    said, complained = running.communicate(timeout=60)
    assert running.returncode == 130
    assert "interrupted at t = " in said
    expected = "error: interrupted; go on with: bemwave run tank.toml --resume\n"
    assert complained == expected
    assert list((tmp_path / "tank-run" / "checkpoint").iterdir())

    # gone on with and stopped again, to see that it does not start from the beginning
    running = start("run", "tank.toml", "--resume", cwd=tmp_path)
    wait_for(tmp_path / "tank-run" / "log.txt", "going on from the checkpoint at t = ")
    running.send_signal(number)
    assert running.wait(timeout=60) == 130
    running.communicate()


@pytest.mark.usefixtures("needs_gmsh")
@pytest.mark.parametrize(
    "number", [signal.SIGINT, pytest.param(signal.SIGTERM, marks=pytest.mark.slow)]
)
def test_a_signal_right_after_the_mesher_ran(number: signal.Signals, tmp_path: Path) -> None:
    (tmp_path / "buoy.toml").write_text(BUOY)
    running = start("run", "buoy.toml", cwd=tmp_path)
    wait_for(tmp_path / "buoy-run" / "log.txt", "route panels")
    sent = time.monotonic()
    running.send_signal(number)
    _, complained = running.communicate(timeout=60)
    assert time.monotonic() - sent < 5.0
    assert running.returncode == 130
    assert complained == "error: interrupted; go on with: bemwave run buoy.toml --resume\n"
    assert open_run(tmp_path / "buoy-run").manifest.status == "interrupted"
    assert list((tmp_path / "buoy-run" / "checkpoint").iterdir())


@pytest.mark.usefixtures("needs_gmsh")
@pytest.mark.parametrize(
    "delay", [2.0, *(pytest.param(s, marks=pytest.mark.slow) for s in (0.5, 3))]
)
def test_a_signal_while_it_is_set_up_leaves_nothing(delay: float, tmp_path: Path) -> None:
    (tmp_path / "buoy.toml").write_text(BUOY)
    running = start("run", "buoy.toml", cwd=tmp_path)
    time.sleep(delay)
    sent = time.monotonic()
    running.send_signal(signal.SIGTERM)
    _, complained = running.communicate(timeout=60)
    assert time.monotonic() - sent < 5.0
    # the interpreter itself ends so while it starts, before there is a command to interrupt
    assert running.returncode in (130, -signal.SIGTERM, -signal.SIGINT)
    assert running.returncode != 130 or complained.startswith("error: interrupted")
    assert "Traceback" not in complained


def test_a_killed_run_leaves_readable_files(tmp_path: Path) -> None:
    (tmp_path / "tank.toml").write_text(TANK)
    running = start("run", "tank.toml", cwd=tmp_path)
    wait_for(tmp_path / "tank-run" / "log.txt", "set up in")
    history = tmp_path / "tank-run" / "history.nc"
    while not (history.exists() and len(open_run(history.parent).times) > 20):
        time.sleep(0.05)
    running.kill()
    running.communicate()
    run = open_run(history.parent)
    assert run.manifest.status == "running"
    assert np.isfinite(run.elevation(0.3, 0.2, run.times)).all()


def test_ctrl_c_before_there_is_a_folder_leaves_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    from bemwave.running import loop

    def interrupted(*arguments: object) -> None:
        raise KeyboardInterrupt

    (tmp_path / "tank.toml").write_text(TANK)
    monkeypatch.setattr(loop, "_assemble", interrupted)
    assert cli.status_of(["run", str(tmp_path / "tank.toml")]) == 130
    assert capsys.readouterr().err.startswith("error: interrupted; go on with: bemwave run ")
    assert [file.name for file in tmp_path.iterdir()] == ["tank.toml"]
