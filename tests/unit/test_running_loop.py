"""The loop: instants of all outputs in order, each once; what is told while it goes on."""

from __future__ import annotations

import logging
import re
from pathlib import Path

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.flow.state import SurfaceState
from bemwave.records import read_checks
from bemwave.running import loop, run, steps
from bemwave.running.progress import kept_in, log, progress

TANK = Case(
    water={"depth": 1.0},
    surface={"size": [3.0, 2.0], "spacing": 0.3, "edges": "wall"},
    hump=[{"height": 0.02, "width": 0.6, "centre": [0.3, 0.1]}],
    run={"duration": 1.0, "record_every": 0.1},
)


class Recorder:
    """An output that keeps the times it was given."""

    def __init__(self, times: list[float]) -> None:
        self.times, self.given = np.array(times), list[float]()

    @property
    def count(self) -> int:
        return len(self.given)

    def write(self, state: SurfaceState) -> None:
        self.given.append(state.time)

    def flush(self) -> None:
        pass


def test_every_output_gets_each_of_its_instants_in_order() -> None:
    third = 1.0 / 3.0
    outputs = {
        "coarse": Recorder([0.0, 1.0, 2.0]),
        "fine": Recorder([0.0, third, 2 * third, 3 * third, 4 * third]),
        "late": Recorder([1.0 + 1e-12, 1.5]),
        "none": Recorder([]),
    }
    visited = []
    for state, wanting in loop._visits(None, dict(outputs)):
        visited.append(state.time)
        for output in wanting:
            output.write(state)
    assert visited == sorted(visited)
    assert len(visited) == 7  # 0, 1/3, 2/3, 1 for three of them, 4/3, 3/2, 2
    for output in outputs.values():
        assert output.given == pytest.approx(output.times, abs=1e-9)


def test_live_steps_and_the_recorded_run_agree(tmp_path: Path) -> None:
    recorded = run(TANK, tmp_path / "run")
    place = np.array([[0.2, -0.3, -0.4], [-0.7, 0.5, -0.1]])
    checked = 0
    for state in steps(TANK):
        known = recorded.state(min(state.time, 1.0))
        scale = np.abs(known.elevation).max()
        # records are single precision, and cubic between themselves
        assert known.elevation == pytest.approx(state.solved.elevation, abs=0.01 * scale)
        near = np.abs(recorded.times - state.time).min()
        if near < 1e-9:
            one, other = state.velocity(place), recorded.velocity(place, state.time)
            assert one == pytest.approx(other, abs=2e-6)
            checked += 1
    assert checked >= 1


def test_live_steps_beside_a_hull_agree_with_the_recorded_run(tmp_path: Path) -> None:
    grid = Case(
        water={"depth": "deep"},
        waves=[{"kind": "regular", "height": 0.05, "period": 1.8}],
        surface={"size": [6.0, 5.0], "spacing": 0.25, "route": "grid", "absorber": 3.0},
        body=[{"name": "ball", "form": "sphere", "radius": 0.5, "panel_size": 0.3}],
        run={"duration": 1.2, "record_every": 0.1},
    )
    recorded = run(grid, tmp_path / "run")
    places = np.array([[1.0, 0.2, -0.3], [0.1, 0.0, -0.2], [-1.2, 0.4, -0.1]])
    for state in steps(grid):
        if np.abs(recorded.times - state.time).min() < 1e-9:
            one, other = state.velocity(places), recorded.velocity(places, state.time)
            assert one == pytest.approx(other, abs=2e-6, nan_ok=True)
            assert np.isnan(one).any(axis=1).tolist() == [False, True, False]
            one = state.elevation([0.0, 1.0], [0.1, 0.2])
            other = recorded.elevation([0.0, 1.0], [0.1, 0.2], state.time)
            assert np.isnan(one).tolist() == [True, False]
            assert one == pytest.approx(other, abs=2e-6, nan_ok=True)
    assert state.time > 1.1


def test_the_log_keeps_what_is_told_with_the_time_of_day(tmp_path: Path) -> None:
    with kept_in(tmp_path / "log.txt"):
        log.info("half way")
    log.info("after the run")
    (line,) = (tmp_path / "log.txt").read_text().splitlines()
    assert line.endswith("  half way")
    assert line[:2] == "20"
    assert all(not isinstance(handler, logging.FileHandler) for handler in log.handlers)


def test_progress_is_a_bar_on_a_terminal_and_silent_elsewhere(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    with progress("solving") as report:
        report(0.5, lambda: "t = 1.0 s")
    assert capsys.readouterr().err == ""
    monkeypatch.setattr("sys.stderr.isatty", lambda: True)
    with progress("solving") as report:
        report(0.5, lambda: "t = 1.0 s")
        report(1.0, lambda: "t = 2.0 s")
    shown = capsys.readouterr().err
    assert "solving" in shown
    assert "100 %" in shown
    assert "t = 2.0 s" in shown


def test_the_bar_tells_the_energy_that_the_check_finds(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr("sys.stderr.isatty", lambda: True)
    monkeypatch.setenv("COLUMNS", "120")
    finished = run(TANK, tmp_path / "run")
    energy = next(v for v in read_checks(finished.folder.checks) if v.name == "energy")
    assert energy.figure is not None
    told = re.findall(r"energy ([0-9.e+-]+) J, ([0-9.e+-]+) % missing", capsys.readouterr().err)
    assert float(told[-1][1]) == pytest.approx(100.0 * energy.figure, rel=0.05)
    assert float(told[-1][0]) > 0.0
